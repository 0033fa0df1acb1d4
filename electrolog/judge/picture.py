"""What the draws say about one question, before anything is decided."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from electrolog.judge import odds
from electrolog.judge.facts import noise_of, stale
from electrolog.judge.question import Question
from electrolog.judge.value import ValueOfCalibration, value_of_calibration

Array = NDArray[np.float64]


@dataclass(frozen=True)
class Outlook:
    """What can only be said where the accepted risk is set and every limit at the run's end can be told.

    longest_min: None where it wasn't asked for.
    """

    risk: float
    longest_min: float | None
    value: ValueOfCalibration


@dataclass(frozen=True)
class Picture:
    log_now: Array
    log_end: Array
    beside: odds.Beside
    noise_said: str
    ends: odds.EndLimits
    broken_now: NDArray[np.bool_]
    broken_end: NDArray[np.bool_]
    width_end: float
    outlook: Outlook | None

    @property
    def p_now(self) -> float:
        return float(self.broken_now.mean())

    @property
    def p_end(self) -> float:
        return float(self.broken_end.mean())

    @property
    def too_wide(self) -> bool:
        return self.ends.widest_interval is not None and self.width_end > self.ends.widest_interval

    @property
    def untold(self) -> tuple[str, ...]:
        """Rules that are set and can't be told."""
        told = odds.values_at(self.log_end, self.beside, self.ends)
        return tuple(rule for rule in self.ends.by_rule if rule not in told)

    def p_by_rule(self) -> dict[str, float]:
        """The odds by the run's end, the likeliest breach first."""
        broken = odds.breaches(self.log_end, self.beside, self.ends)
        return dict(sorted(((rule, float(mask.mean())) for rule, mask in broken.items()), key=lambda item: -item[1]))


def look(question: Question) -> Picture:
    log_now, log_end = question.log_sensitivity_at(0.0), question.log_sensitivity_at(question.run_min)
    noise = noise_of(question.calibration) if question.calibration else None
    beside = odds.Beside(question.reference_log_sensitivity, noise.draws(len(log_now)) if noise else None)
    ends = odds.EndLimits.of(question.limits, question.needs_um)
    broken_now, broken_end = (odds.any_breach(log, beside, ends) for log in (log_now, log_end))
    return Picture(
        log_now=log_now,
        log_end=log_end,
        beside=beside,
        noise_said=noise.said if noise else "",
        ends=ends,
        broken_now=broken_now,
        broken_end=broken_end,
        width_end=float(odds.relative_width(log_end)),
        outlook=_outlook(question, beside, ends, (log_now, log_end, broken_now, broken_end)),
    )


def _outlook(
    question: Question,
    beside: odds.Beside,
    ends: odds.EndLimits,
    drawn: tuple[Array, Array, NDArray[np.bool_], NDArray[np.bool_]],
) -> Outlook | None:
    risk = question.limits.accepted_risk()
    if risk is None or not ends.by_rule or len(odds.values_at(drawn[0], beside, ends)) < len(ends.by_rule):
        return None
    value = value_of_calibration(
        *drawn,
        reading_sd_log=question.reading_sd_log,
        accepted_risk=risk.value,
        widest_interval=ends.widest_interval,
        stands=question.calibration is not None and not stale(question.calibration, question.limits),
    )

    def holds_at(minutes: NDArray[np.int64]) -> NDArray[np.bool_]:
        return odds.holds(question.log_sensitivity_at(float(minutes[0]))[None, :], beside, ends, risk.value)

    return Outlook(risk.value, float(odds.longest_run_min(holds_at, 1)[0]), value)
