"""What the last calibration measured, whether it still stands, and which limits it broke by itself."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from electrolog.judge.limits import Limits
from electrolog.units import shown_number

Array = NDArray[np.float64]


@dataclass(frozen=True)
class Reason:
    """`rule` is a limit's name, or one of: calibration, state, odds, run-length, limits, clocks."""

    rule: str
    text: str


@dataclass(frozen=True)
class CalibrationFacts:
    """The last calibration with this analyte and waveform. None: not measured.

    age_h: its age at the start of the run. events_since: what voids it since, in words ("a run on 3 May",
    "cleaned", "re-coated", "re-cut"). noise_na: standard deviation of the signal at rest, and noise_before_na
    that of the calibration before. blank_sd_na and residual_sd_na: of the blanks and about the line, with
    their degrees of freedom. The detection limit rests on the noise; where it wasn't noted, on that of the other two
    which has more degrees of freedom.
    peak_shift_v: of the oxidation peak since the reference calibration.
    """

    age_h: float
    events_since: tuple[str, ...] = ()
    standard_past_use_by: bool = False
    noise_na: float | None = None
    noise_before_na: float | None = None
    blank_sd_na: float | None = None
    blank_degrees_of_freedom: int | None = None
    residual_sd_na: float | None = None
    residual_degrees_of_freedom: int | None = None
    r_squared: float | None = None
    peak_shift_v: float | None = None


@dataclass(frozen=True)
class Noise:
    """What the detection limit rests on; degrees_of_freedom None: taken as known."""

    sd_na: float
    degrees_of_freedom: int | None
    said: str

    def draws(self, count: int) -> Array:
        """(count,) equally likely values of the true deviation: s·√(ν/χ²_ν), in an order free of any other draw's.

        A deviation from two degrees of freedom can be wrong by a factor of three; a detection limit that
        took it as known would promise what nobody measured.
        """
        if self.degrees_of_freedom is None:
            return np.full(count, self.sd_na)
        # Every 64th of many sorted draws is as good as a quantile, without scipy's import.
        rng, freedom = np.random.default_rng(count), self.degrees_of_freedom
        quantiles = np.sort(rng.chisquare(freedom, 64 * count))[32::64]
        return self.sd_na * np.sqrt(freedom / rng.permutation(quantiles))


def noise_of(facts: CalibrationFacts) -> Noise | None:
    if facts.noise_na:
        return Noise(facts.noise_na, None, "the signal's noise at the last calibration")
    blanks, points = facts.blank_degrees_of_freedom or 0, facts.residual_degrees_of_freedom or 0
    if facts.blank_sd_na and blanks and blanks >= points:
        return Noise(facts.blank_sd_na, blanks, "the scatter of its blanks")
    if facts.residual_sd_na and points:
        return Noise(facts.residual_sd_na, points, "the scatter of its points about the line")
    return None


def stale(facts: CalibrationFacts, limits: Limits) -> tuple[Reason, ...]:
    """Why the calibration no longer stands; empty when it does. Its age counts only against a set limit."""
    oldest_h = limits.value("oldest-calibration")
    said = []
    if oldest_h is not None and facts.age_h > oldest_h:
        text = f"the last calibration is {_hours(facts.age_h)} old; the limit is {_hours(oldest_h)}"
        said.append(Reason("oldest-calibration", text))
    if facts.events_since:
        said.append(Reason("calibration", f"since the last calibration: {', '.join(facts.events_since)}"))
    if facts.standard_past_use_by:
        said.append(Reason("calibration", "the last calibration's standard was past its use-by date"))
    return tuple(said)


@dataclass(frozen=True)
class Measured:
    """Limits that the last calibration, or the count of runs, meets or breaks by itself.

    repairable: broken, but a new calibration could read otherwise. final: broken, and none could.
    unknown: the limit is set and nobody measured what it asks.
    """

    repairable: tuple[Reason, ...]
    final: tuple[Reason, ...]
    unknown: tuple[Reason, ...]


def measured(facts: CalibrationFacts | None, uses: int, limits: Limits) -> Measured:
    sorted_out: dict[str, list[Reason]] = {"repairable": [], "final": _too_many_uses(uses, limits), "unknown": []}
    for check in (_r_squared, _peak_shift, _noise):
        found = check(facts, limits) if facts else None
        if found is not None:
            sorted_out[found[0]].append(found[1])
    return Measured(**{kind: tuple(reasons) for kind, reasons in sorted_out.items()})


_Check = tuple[str, Reason] | None


def _r_squared(facts: CalibrationFacts, limits: Limits) -> _Check:
    rule = "lowest-r-squared"
    lowest = limits.value(rule)
    if lowest is None:
        return None
    if facts.r_squared is None:
        return "unknown", Reason(rule, "r² of the last calibration is unknown: calibrate with more levels")
    if facts.r_squared >= lowest:
        return None
    text = f"r² of the last calibration is {facts.r_squared:.4f}; the limit is {shown_number(lowest, 4)}"
    return "repairable", Reason(rule, text)


def _peak_shift(facts: CalibrationFacts, limits: Limits) -> _Check:
    """Most often the reference electrode's doing, not the probe's: a fresh one and a new calibration tell."""
    rule = "largest-peak-shift"
    most_v = limits.value(rule)
    if most_v is None:
        return None
    if facts.peak_shift_v is None:
        return "unknown", Reason(rule, "the peak's potential wasn't noted at the last or the reference calibration")
    if abs(facts.peak_shift_v) <= most_v:
        return None
    text = (
        f"the oxidation peak has moved by {facts.peak_shift_v * 1e3:+.0f} mV; the limit is {most_v * 1e3:.0f} mV: "
        "calibrate against a fresh reference electrode"
    )
    return "repairable", Reason(rule, text)


def _noise(facts: CalibrationFacts, limits: Limits) -> _Check:
    """Once may be a poor ground; twice in a row is the probe."""
    rule = "highest-noise"
    highest_na = limits.value(rule)
    if highest_na is None:
        return None
    if facts.noise_na is None:
        return "unknown", Reason(rule, "the noise wasn't noted at the last calibration")
    if facts.noise_na <= highest_na:
        return None
    text = f"the noise is {shown_number(facts.noise_na)} nA; the limit is {shown_number(highest_na)} nA"
    if facts.noise_before_na is not None and facts.noise_before_na > highest_na:
        return "final", Reason(rule, f"{text}, and it was {shown_number(facts.noise_before_na)} nA the time before")
    return "repairable", Reason(rule, f"{text}: look at the ground and the seal, and measure again")


def _too_many_uses(uses: int, limits: Limits) -> list[Reason]:
    most = limits.value("most-uses")
    if most is None or uses + 1 <= most:
        return []
    return [Reason("most-uses", f"the probe has served {uses} runs; the limit is {most:.0f}, this one included")]


def _hours(hours: float) -> str:
    return f"{shown_number(hours)} h" if hours < 96 else f"{hours / 24:.0f} days"


def clocks_disagree(facts: CalibrationFacts) -> tuple[Reason, ...]:
    if math.isfinite(facts.age_h) and facts.age_h >= 0:
        return ()
    return (Reason("clocks", "the last calibration lies after the start of this run: check the clocks or the entry"),)
