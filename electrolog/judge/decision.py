"""Fit, recalibrate, retire or undetermined: the rules, and the order in which they apply.

In this order; the first that applies decides:

1. out of use (retired, lost, broken): retire (decided before this is asked).
2. the limits contradict each other: undetermined (likewise).
3. a limit is broken that no calibration could change (most uses, noise too high twice in a row): retire.
4. a limit that the question needs isn't set, or the clocks disagree: undetermined. Needed are accepted-risk (or both
   costs), oldest-calibration, and one of least-share-left, highest-detection-limit or the signal to be seen.
5. never calibrated with this analyte and waveform: recalibrate.
6. already now the odds of a breach are at least 1 − accepted risk: retire.
7. the calibration is too old or voided: recalibrate, whatever the forecast says.
8. a set limit asks for something nobody measured: undetermined.
9. the last calibration itself broke a limit (r², peak shift, noise once): recalibrate.
10. the odds by the run's end are within the accepted risk, and the interval within its limit: fit.
11. they aren't. Where a calibration has a plausible chance to make it fit: recalibrate. Where the
    probe is more likely broken than not already now, and a calibration hasn't such a chance for the shortest of
    runs either: retire, because nothing that can be measured would save it. What is left is a probe that may be
    sound and a run too long for it. It is not fit for this run, and throwing it away would waste it, so the answer
    is recalibrate, with the reason `run-length` first: take another probe or shorten the run, and calibrate this
    one before its next.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, replace

from electrolog.judge import facts as last
from electrolog.judge import words
from electrolog.judge.facts import CalibrationFacts, Measured, Reason
from electrolog.judge.limits import Limits
from electrolog.judge.picture import Outlook

FIT, RECALIBRATE, RETIRE, UNDETERMINED = "fit", "recalibrate", "retire", "undetermined"
PLAUSIBLE_CHANCE = 0.10  # with less than one chance in ten, a calibration isn't worth its hour


@dataclass(frozen=True)
class Situation:
    """p_now and p_end: odds that a limit which can be told is broken. asked: whether any is set. untold: those set
    that can't be told. outlook: asked for only where the answer hangs on it, because it is the dear part.
    """

    calibration: CalibrationFacts | None
    uses: int
    limits: Limits
    assay: str
    p_now: float
    p_end: float
    too_wide: bool
    asked: bool
    untold: tuple[str, ...]
    outlook: Callable[[], Outlook | None]


@dataclass(frozen=True)
class Decision:
    """by_odds: whether the odds of each limit belong among the reasons, after these. p_breach: see Verdict."""

    word: str
    reasons: tuple[Reason, ...] = ()
    by_odds: bool = True
    p_breach: float | None = None


def decide(at: Situation) -> Decision:
    measured = last.measured(at.calibration, at.uses, at.limits)
    decision = _decide(at, measured)
    return replace(decision, p_breach=_p_breach(at, measured, decision.word))


def _p_breach(at: Situation, measured: Measured, word: str) -> float | None:
    if at.too_wide or measured.repairable or measured.final:
        return 1.0
    # Where some limit can't be told, the odds of the others are a least value, worth saying only if they decide.
    told = at.asked and not at.untold
    return at.p_end if told or (word == RETIRE and at.p_end > 0) else None


def _decide(at: Situation, measured: Measured) -> Decision:
    facts, risk = at.calibration, at.limits.accepted_risk()
    if measured.final:
        return Decision(RETIRE, measured.final, by_odds=False)
    unset = _unset(at) + (last.clocks_disagree(facts) if facts else ())
    if unset or risk is None:
        return Decision(UNDETERMINED, unset, by_odds=False)
    if facts is None:
        said = Reason("calibration", f"never calibrated with {at.assay}: calibrate it first")
        return Decision(RECALIBRATE, (said,), by_odds=False)
    if at.p_now >= 1 - risk.value:
        return Decision(RETIRE, (words.broken_already(at.p_now),))
    return _with_calibration(facts, at, measured)


def _unset(at: Situation) -> tuple[Reason, ...]:
    """Limits that any question needs: without them the odds mean nothing, and fit would be a guess."""
    found = [] if at.limits.accepted_risk() else [words.unset("accepted-risk")]
    found += [] if at.limits.get("oldest-calibration") else [words.unset("oldest-calibration")]
    return (*found, *([] if at.asked else [words.nothing_asked()]))


def _with_calibration(facts: CalibrationFacts, at: Situation, measured: Measured) -> Decision:
    unknown = measured.unknown + tuple(words.untold(rule) for rule in at.untold)
    stale = last.stale(facts, at.limits)
    if stale:
        return Decision(RECALIBRATE, (*stale, *measured.repairable, *unknown))
    if unknown:
        return Decision(UNDETERMINED, (*unknown, *measured.repairable))
    if measured.repairable:
        return Decision(RECALIBRATE, measured.repairable)
    return _by_odds(at)


def _by_odds(at: Situation) -> Decision:
    risk = at.limits.accepted_risk()
    if risk is not None and at.p_end <= risk.value and not at.too_wide:
        return Decision(FIT)
    outlook = at.outlook()
    if outlook is None or outlook.value.chance_fit >= PLAUSIBLE_CHANCE:
        return Decision(RECALIBRATE)
    if at.p_now > 0.5 and outlook.value.chance_any_run < PLAUSIBLE_CHANCE:
        return Decision(RETIRE, (words.beyond_saving(at.p_now, outlook.value.chance_any_run),))
    return Decision(RECALIBRATE, (words.run_too_long(outlook.longest_min, outlook.value),))
