"""What the points of a calibration don't say, or say against themselves: one plain sentence each."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

from electrolog.measure.detection import claimed_below_detection
from electrolog.measure.line import LineFit, levels_um
from electrolog.measure.points import (
    SuspectPoint,
    curvature_p,
    growing_scatter,
    lack_of_fit,
    p_against_zero,
    tells_from_zero,
)
from electrolog.measure.recording import NEGATIVE
from electrolog.measure.saturating import SaturatingFit

SIGNIFICANT = 0.05
CLEARLY = 0.01  # for what is looked at in every calibration: one false remark in a hundred
REPLICATE_SHARE = 0.10  # common practice: replicates of one injection agree within 10 %


@dataclass(frozen=True)
class Outcome:
    """One calibration, fitted: what the remarks look at. `curve` is None where the line was kept."""

    line: LineFit
    curve: SaturatingFit | None
    suspect: SuspectPoint | None
    noise_na: float | None

    @property
    def sensitivity_na_um(self) -> float:
        return self.line.slope_na_um if self.curve is None else self.curve.sensitivity_na_um

    @property
    def sensitivity_se_na_um(self) -> float:
        return self.line.slope_se_na_um if self.curve is None else self.curve.sensitivity_se_na_um

    @property
    def offset_na(self) -> tuple[float, float]:
        """With its standard error."""
        if self.curve is None:
            return self.line.intercept_na, self.line.intercept_se_na
        return self.curve.offset_na, self.curve.offset_se_na

    @property
    def degrees_of_freedom(self) -> int:
        return self.line.degrees_of_freedom if self.curve is None else self.curve.degrees_of_freedom

    @property
    def responds(self) -> bool:
        return tells_from_zero(self.sensitivity_na_um, self.sensitivity_se_na_um, self.degrees_of_freedom)

    @property
    def lowest_um(self) -> float:
        return float(self.line.concentration_um[self.line.concentration_um > 0].min())

    @property
    def levels(self) -> int:
        return len(levels_um(self.line.concentration_um))


def is_flat(line: LineFit) -> bool:
    """The same current at every concentration: a dead probe, an open circuit, or zeros typed in."""
    return bool(np.ptp(line.current_na) == 0) and (not line.through_zero or line.current_na[0] == 0)


def without_response(concentrations: int) -> str:
    if concentrations == 0:
        return "no points: nothing can be computed"
    return "every concentration is zero: a sensitivity needs a current at a concentration above zero"


def all_of(outcome: Outcome, lod_um: float | None) -> tuple[str, ...]:
    said = [remark(outcome) for remark in REMARKS] + [claimed_below_detection(outcome.lowest_um, lod_um)]
    return tuple(text for text in said if text)


def _few_points(outcome: Outcome) -> str | None:
    line = outcome.line
    if is_flat(line):
        return None
    if outcome.levels == 1:
        alone = "" if line.n_points > 1 else ", and one point gives it no standard error"
        return (
            f"one concentration only ({line.concentration_um[0]:g} µM): the sensitivity assumes a line "
            f"through zero, which these points can't test{alone}"
        )
    if line.degrees_of_freedom == 0:
        return f"{line.n_points} points: the line runs exactly through them, so there is no standard error"
    if outcome.levels == 2:
        return "two concentrations only: whether the response is linear can't be tested"
    if line.degrees_of_freedom == 1:
        return f"{line.n_points} points: the standard errors rest on a single degree of freedom"
    return None


def _falling(outcome: Outcome) -> str | None:
    line = outcome.line
    if line.slope_na_um >= 0:
        return None
    falls = f"the current falls as the concentration rises ({line.slope_na_um:.4g} nA/µM)"
    if (line.current_na[line.concentration_um > 0] < 0).all():
        return f"{falls} and every current is negative: {NEGATIVE} Nothing was turned"
    return f"{falls}: no detection limit can be stated"


def _no_response(outcome: Outcome) -> str | None:
    if is_flat(outcome.line):
        return (
            f"every current is {outcome.line.current_na[0]:g} nA, whatever the concentration: no response was "
            "measured, and points without scatter don't tell how surely; was the probe connected?"
        )
    p = p_against_zero(outcome.sensitivity_na_um, outcome.sensitivity_se_na_um, outcome.degrees_of_freedom)
    if not p >= SIGNIFICANT:
        return None
    return (
        f"the sensitivity {outcome.sensitivity_na_um:.3g} ± {outcome.sensitivity_se_na_um:.3g} nA/µM can't "
        f"be told from zero (p = {p:.2g}): it gives no detection limit and no concentration"
    )


def _exact(outcome: Outcome) -> str | None:
    line = outcome.line
    if line.degrees_of_freedom < 1 or line.slope_na_um == 0 or not line.exact():
        return None
    return "the points lie exactly on the line, without any scatter: computed rather than measured?"


def _levels_off(outcome: Outcome) -> str | None:
    if outcome.curve is None:
        return None
    return (
        f"the current levels off (largest {outcome.curve.current_max_na:.3g} nA above the offset): an "
        f"adsorption isotherm was fitted, and the sensitivity is its slope at low concentration"
    )


def _not_straight(outcome: Outcome) -> str | None:
    if outcome.curve is not None or outcome.line.exact():
        return None
    test = lack_of_fit(outcome.line)
    if test.significant(SIGNIFICANT):
        return (
            f"the means lie off the line by more than the replicates' scatter allows "
            f"(F = {test.f:.3g}, p = {test.p:.2g})"
        )
    if curvature_p(outcome.line) > 1 - CLEARLY:
        return "the current rises faster than the concentration: the points bend away from the line upwards"
    return None


def _suspect(outcome: Outcome) -> str | None:
    point = outcome.suspect
    if point is None:
        return None
    off = min(abs(point.studentised_residual), 999)
    return (
        f"point {point.index + 1} ({point.concentration_um:g} µM, {point.current_na:g} nA) lies {off:.3g} "
        "standard errors off the line through the others; it was kept"
    )


def _offset(outcome: Outcome) -> str | None:
    offset_na, se_na = outcome.offset_na
    p = p_against_zero(offset_na, se_na, outcome.degrees_of_freedom)
    if outcome.line.through_zero or outcome.line.exact() or not p < CLEARLY:
        return None
    return (
        f"the line misses zero: intercept {offset_na:.3g} ± {se_na:.2g} nA (p = {p:.2g}); "
        "look at the background subtraction and the blank"
    )


def _replicates(outcome: Outcome) -> str | None:
    """Replicates near the noise scatter by nature: they disagree only beyond four times it."""
    line, noise_na = outcome.line, outcome.noise_na or 0.0
    for level_um in levels_um(line.concentration_um[line.concentration_um > 0]):
        current_na = line.current_na[line.concentration_um == level_um]
        mean_na = abs(float(current_na.mean()))
        sd_na = float(current_na.std(ddof=1)) if len(current_na) > 1 else 0.0
        if sd_na > REPLICATE_SHARE * mean_na and np.ptp(current_na) > 4 * noise_na:
            return (
                f"the {len(current_na)} replicates at {level_um:g} µM disagree: {current_na.min():g} to "
                f"{current_na.max():g} nA"
            )
    return None


def _uneven_scatter(outcome: Outcome) -> str | None:
    grown = growing_scatter(outcome.line)
    if grown is None:
        return None
    return (
        f"the replicates scatter more from {grown.from_um:g} µM on (sd {grown.high_na:.2g} nA, below it "
        f"{grown.low_na:.2g} nA): as weighted here, the standard errors are too small; weights of 1/x² fit such points"
    )


def _clipped(outcome: Outcome) -> str | None:
    line = outcome.line
    top_um = levels_um(line.concentration_um[line.current_na == line.current_na.max()])
    if len(top_um) < 2 or line.slope_na_um <= 0:
        return None
    return (
        f"the highest current, {line.current_na.max():g} nA, stands at {len(top_um)} concentrations "
        f"({', '.join(f'{level:g}' for level in top_um)} µM): was the amplifier at its limit?"
    )


REMARKS: tuple[Callable[[Outcome], str | None], ...] = (
    _few_points,
    _falling,
    _no_response,
    _exact,
    _levels_off,
    _not_straight,
    _suspect,
    _offset,
    _replicates,
    _uneven_scatter,
    _clipped,
)
