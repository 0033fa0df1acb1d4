"""The verdict on one probe for one run, with everything that is said about it.

decision.py has the rules and their order.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import Any

import numpy as np
from numpy.typing import NDArray

from electrolog.judge import odds, words
from electrolog.judge.decision import FIT, RETIRE, UNDETERMINED, Decision, Situation, decide
from electrolog.judge.facts import Reason
from electrolog.judge.limits import contradictions
from electrolog.judge.picture import Outlook, Picture, look
from electrolog.judge.question import Question, refuse_nonsense
from electrolog.judge.value import ValueOfCalibration

__all__ = ["Change", "NowAndEnd", "Question", "Verdict", "judge"]

Array = NDArray[np.float64]
Spread = tuple[float, float, float]  # 5, 50 and 95 % quantiles

WORTH_CLEANING = 0.1  # a smaller fall of the odds isn't worth the hour and the new calibration


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
    """Something that would change the verdict: shorten, recalibrate or clean. p_breach: the odds then."""

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
    decision = decide(_situation(question, seen))
    reasons = (*decision.reasons, *(_odds_reasons(seen) if decision.by_odds else ()))
    return _verdict(question, seen, decision, reasons)


def _situation(question: Question, seen: Picture) -> Situation:
    return Situation(
        question.calibration,
        question.uses,
        question.limits,
        question.assay,
        seen.p_now,
        seen.p_end,
        seen.too_wide,
        bool(seen.ends.by_rule),
        seen.untold,
        lambda: seen.outlook,
    )


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


def _verdict(question: Question, seen: Picture, decision: Decision, reasons: tuple[Reason, ...]) -> Verdict:
    beside, times, outlook = seen.beside, seen.ends.signal_to_noise, seen.outlook
    logs = (seen.log_now, seen.log_end)
    return Verdict(
        decision.word,
        reasons,
        p_breach=decision.p_breach,
        longest_run_min=outlook.longest_min if outlook else None,
        sensitivity_na_um=NowAndEnd.of(*(np.exp(log) for log in logs)),
        fraction_left=NowAndEnd.of(*(beside.share(log) for log in logs)),
        lod_um=NowAndEnd.of(*(beside.lod_um(log, times) for log in logs)),
        p_breach_now=seen.p_now if outlook else None,
        p_by_rule=seen.p_by_rule(),
        changes=_changes(question, seen, outlook, decision) if outlook and decision.word != FIT else (),
        value_of_calibration=outlook.value if outlook else None,
    )


def _changes(question: Question, seen: Picture, outlook: Outlook, decision: Decision) -> tuple[Change, ...]:
    """What would make the answer another one; a calibration isn't offered where the reasons call it hopeless."""
    found = []
    if outlook.longest_min and outlook.longest_min < question.run_min:
        found.append(Change("shorten", words.shorten(outlook.longest_min), outlook.risk))
    if decision.word != RETIRE and not any(reason.rule == "run-length" for reason in decision.reasons):
        found.append(Change("recalibrate", words.recalibrate(outlook.value), outlook.value.p_breach_if_fit))
    return (*found, *_cleanings(question, seen, outlook))


def _cleanings(question: Question, seen: Picture, outlook: Outlook) -> list[Change]:
    """Those that would matter, the best first."""
    found = []
    for method, log_sensitivity_at in question.after_cleaning.items():
        p = float(odds.any_breach(log_sensitivity_at(question.run_min), seen.beside, seen.ends).mean())
        if p < seen.p_end and (p <= outlook.risk < seen.p_end or seen.p_end - p >= WORTH_CLEANING):
            found.append(Change("clean", words.clean_first(method, seen.p_end, p), p))
    return sorted(found, key=lambda change: change.p_breach or 0.0)


def _quantiles(spread: Spread | None) -> dict[str, float | None]:
    return {f"{q:g}": value for q, value in zip(odds.QUANTILES, spread or (None, None, None), strict=True)}
