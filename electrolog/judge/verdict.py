"""Fit, recalibrate, retire or undetermined: the verdict on one probe for one run.

In this order; the first that applies decides:

1. out of use (retired, lost, broken): retire.
2. the limits contradict each other: undetermined.
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

from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import Any

import numpy as np
from numpy.typing import NDArray

from electrolog.judge import facts as last
from electrolog.judge import odds, words
from electrolog.judge.facts import CalibrationFacts, Reason
from electrolog.judge.limits import contradictions
from electrolog.judge.picture import Outlook, Picture, look
from electrolog.judge.question import Question, refuse_nonsense
from electrolog.judge.value import ValueOfCalibration

__all__ = ["Change", "NowAndEnd", "Question", "Verdict", "judge"]

Array = NDArray[np.float64]
Spread = tuple[float, float, float]  # 5, 50 and 95 % quantiles

FIT, RECALIBRATE, RETIRE, UNDETERMINED = "fit", "recalibrate", "retire", "undetermined"
PLAUSIBLE_CHANCE = 0.10  # with less than one chance in ten, a calibration isn't worth its hour


@dataclass(frozen=True)
class NowAndEnd:
    """Quantiles at the start and at the end of the run; None: unknown."""

    now: Spread | None = None
    end: Spread | None = None

    @classmethod
    def of(cls, now: Array | None, end: Array | None) -> NowAndEnd:
        return cls(*(None if drawn is None else odds.spread(drawn) for drawn in (now, end)))

    def to_dict(self) -> dict[str, dict[str, float | None]]:
        return {"now": _quantiles(self.now), "end": _quantiles(self.end)}


@dataclass(frozen=True)
class Change:
    """Something that would change the verdict: shorten, recalibrate, clean or set-limit."""

    what: str
    text: str
    p_breach: float | None = None


@dataclass(frozen=True)
class Verdict:
    """p_breach: the probability that a limit is broken by the end of the run; 1 when the last calibration has
    already broken one by itself. A calibration's age breaks nothing about the probe and isn't counted. None: can't be
    told. p_by_rule: the same, limit by limit. longest_run_min: by the odds alone; None where they can't be told.
    """

    verdict: str
    reasons: tuple[Reason, ...]
    p_breach: float | None = None
    longest_run_min: float | None = None
    sensitivity_na_um: NowAndEnd = NowAndEnd()
    fraction_left: NowAndEnd = NowAndEnd()
    lod_um: NowAndEnd = NowAndEnd()
    p_breach_now: float | None = None
    p_by_rule: Mapping[str, float] = field(default_factory=dict)
    changes: tuple[Change, ...] = ()
    value_of_calibration: ValueOfCalibration | None = None

    def to_dict(self) -> dict[str, Any]:
        """The verdict's part of the machine-readable answer; unknown is None, never NaN."""
        return {
            "verdict": self.verdict,
            "reasons": [{"rule": reason.rule, "text": reason.text} for reason in self.reasons],
            "p_breach": self.p_breach,
            "longest_run_min": self.longest_run_min,
            "sensitivity_na_um": self.sensitivity_na_um.to_dict(),
            "fraction_left": self.fraction_left.to_dict(),
            "lod_um": self.lod_um.to_dict(),
        }


def judge(question: Question) -> Verdict:
    """Raises InputError for a run that isn't longer than zero, or a needed concentration that isn't above zero."""
    refuse_nonsense(question)
    if question.out_of_use:
        return Verdict(RETIRE, (Reason("state", question.out_of_use),), longest_run_min=0.0)
    against = tuple(Reason("limits", text) for text in contradictions(question.limits))
    if against:
        return Verdict(UNDETERMINED, against)
    seen = look(question)
    word, reasons = _decide(question, seen)
    return _verdict(question, seen, word, reasons)


_Decision = tuple[str, tuple[Reason, ...]]


def _decide(question: Question, seen: Picture) -> _Decision:
    facts, limits, risk = question.calibration, question.limits, question.limits.accepted_risk()
    final = last.measured(facts, question.uses, limits).final if facts else last.too_many_uses(question.uses, limits)
    if final:
        return RETIRE, final
    unset = _unset(question, seen) + (last.clocks_disagree(facts) if facts else ())
    if unset or risk is None:
        return UNDETERMINED, unset
    if facts is None:
        return RECALIBRATE, (Reason("calibration", f"never calibrated with {question.assay}: calibrate it first"),)
    if seen.p_now >= 1 - risk.value:
        return RETIRE, (words.broken_already(seen.p_now), *_odds_reasons(seen))
    return _with_calibration(facts, question, seen)


def _with_calibration(facts: CalibrationFacts, question: Question, seen: Picture) -> _Decision:
    measured = last.measured(facts, question.uses, question.limits)
    unknown = measured.unknown + tuple(words.untold(rule) for rule in seen.untold)
    stale = last.stale(facts, question.limits)
    if stale:
        return RECALIBRATE, (*stale, *measured.repairable, *unknown, *_odds_reasons(seen))
    if unknown or seen.outlook is None:
        return UNDETERMINED, (*unknown, *measured.repairable, *_odds_reasons(seen))
    if measured.repairable:
        return RECALIBRATE, (*measured.repairable, *_odds_reasons(seen))
    return _by_odds(seen, seen.outlook)


def _by_odds(seen: Picture, outlook: Outlook) -> _Decision:
    said = _odds_reasons(seen)
    if seen.p_end <= outlook.risk and not seen.too_wide:
        return FIT, said
    if outlook.value.chance_fit >= PLAUSIBLE_CHANCE:
        return RECALIBRATE, said
    if seen.p_now > 0.5 and outlook.value.chance_any_run < PLAUSIBLE_CHANCE:
        return RETIRE, (words.beyond_saving(seen.p_now, outlook.value.chance_any_run), *said)
    return RECALIBRATE, (words.run_too_long(outlook.longest_min, outlook.value.chance_fit), *said)


def _unset(question: Question, seen: Picture) -> tuple[Reason, ...]:
    """Limits that any question needs: without them the odds mean nothing, and fit would be a guess."""
    limits = question.limits
    found = [] if limits.accepted_risk() else [words.unset("accepted-risk")]
    found += [] if limits.get("oldest-calibration") else [words.unset("oldest-calibration")]
    return (*found, *([] if seen.ends.by_rule else [words.nothing_asked()]))


def _odds_reasons(seen: Picture) -> tuple[Reason, ...]:
    """One sentence per limit at the run's end, the likeliest to break first, and the odds of all together."""
    values, p_by_rule = odds.values_at(seen.log_end, seen.beside, seen.ends), seen.p_by_rule()
    said = [_limit_reason(rule, odds.spread(values[rule]), p, seen) for rule, p in p_by_rule.items()]
    if seen.ends.widest_interval is not None:
        said.append(words.width(seen.width_end, seen.ends.widest_interval))
    if len(p_by_rule) > 1 and seen.outlook:
        said.append(words.together(seen.p_end, seen.outlook.risk))
    return tuple(said)


def _limit_reason(rule: str, found: Spread, p: float, seen: Picture) -> Reason:
    limit = seen.ends.by_rule[rule]
    if rule == odds.SHARE:
        return words.share_left(found, limit, p)
    return words.detection_limit(rule, found, limit, p, seen.ends.signal_to_noise, seen.noise_said)


def _verdict(question: Question, seen: Picture, word: str, reasons: tuple[Reason, ...]) -> Verdict:
    beside, times, outlook = seen.beside, seen.ends.signal_to_noise, seen.outlook
    logs = (seen.log_now, seen.log_end)
    return Verdict(
        word,
        reasons,
        p_breach=_p_breach(question, seen, word),
        longest_run_min=outlook.longest_min if outlook else None,
        sensitivity_na_um=NowAndEnd.of(*(np.exp(log) for log in logs)),
        fraction_left=NowAndEnd.of(*(beside.share(log) for log in logs)),
        lod_um=NowAndEnd.of(*(beside.lod_um(log, times) for log in logs)),
        p_breach_now=seen.p_now if outlook else None,
        p_by_rule=seen.p_by_rule(),
        changes=_changes(question, seen, outlook) if outlook and word != FIT else (),
        value_of_calibration=outlook.value if outlook else None,
    )


def _p_breach(question: Question, seen: Picture, word: str) -> float | None:
    facts = question.calibration
    measured = last.measured(facts, question.uses, question.limits) if facts else None
    if seen.too_wide or (measured and (measured.repairable or measured.final)):
        return 1.0
    # Where some limit can't be told, the odds of the others are a least value, worth saying only if they decide.
    told = seen.ends.by_rule and not seen.untold
    return seen.p_end if told or (word == RETIRE and seen.p_end > 0) else None


def _changes(question: Question, seen: Picture, outlook: Outlook) -> tuple[Change, ...]:
    """What would make the answer another one."""
    found = []
    if 0 < outlook.longest_min < question.run_min:
        found.append(Change("shorten", words.shorten(outlook.longest_min), outlook.risk))
    found.append(Change("recalibrate", words.recalibrate(outlook.value), outlook.value.p_breach_if_fit))
    for method, log_sensitivity_at in question.after_cleaning.items():
        p = float(odds.any_breach(log_sensitivity_at(question.run_min), seen.beside, seen.ends).mean())
        if p < seen.p_end:
            found.append(Change("clean", words.clean_first(method, seen.p_end, p), p))
    return tuple(found)


def _quantiles(spread: Spread | None) -> dict[str, float | None]:
    return {f"{q:g}": value for q, value in zip(odds.QUANTILES, spread or (None, None, None), strict=True)}
