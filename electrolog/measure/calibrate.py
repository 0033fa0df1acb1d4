"""The door of this room: from the points of one calibration to its figures, with what they can't say said."""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import asdict, dataclass, fields
from typing import Any

import numpy as np
from numpy.typing import ArrayLike, NDArray

from electrolog.errors import DataError, InputError
from electrolog.measure.detection import from_noise, from_residuals
from electrolog.measure.line import LineFit, fit_line, levels_um
from electrolog.measure.linear import LINEAR_SHARE, linear_to_um
from electrolog.measure.points import curvature_p, lack_of_fit, suspect_point
from electrolog.measure.remarks import Outcome, all_of, is_flat, without_response
from electrolog.measure.saturating import SaturatingFit, fit_saturating
from electrolog.measure.tails import t_quantile
from electrolog.measure.uneven import allowance
from electrolog.measure.version import METHOD

BENT = 0.01  # stricter than usual: a handful of points bends by chance, and a needless curve costs precision
BENT_WITH_LACK_OF_FIT = 0.05

Array = NDArray[np.float64]


@dataclass(frozen=True)
class CalibrationFigures:
    """What one calibration says. None: unknown, and a warning says why.

    `sensitivity_se_na_um` is from the scatter of this calibration's points alone; the shared one is from the
    standard, the same for every probe measured with it. The 95 % interval `sensitivity_low_na_um` to
    `sensitivity_high_na_um` holds both; `interval_route` says where it allows for scatter that grows with the
    concentration, and `weighting` how the points were weighted, if not alike. `lod_um` and `loq_um` are 3 and 10
    standard deviations over the sensitivity; `lod_route` says of what. `shape` is line, line-through-zero or
    saturating (then the sensitivity is the slope at low concentration). `suspect_point` counts from 0; that point
    was kept.
    """

    sensitivity_na_um: float | None = None
    sensitivity_se_na_um: float | None = None
    sensitivity_se_shared_na_um: float | None = None
    sensitivity_low_na_um: float | None = None
    sensitivity_high_na_um: float | None = None
    interval_route: str | None = None
    weighting: str | None = None
    intercept_na: float | None = None
    intercept_se_na: float | None = None
    residual_sd_na: float | None = None
    degrees_of_freedom: int | None = None
    r_squared: float | None = None
    n_points: int = 0
    lod_um: float | None = None
    loq_um: float | None = None
    lod_route: str | None = None
    linear_to_um: float | None = None
    shape: str | None = None
    suspect_point: int | None = None
    warnings: tuple[str, ...] = ()
    method: str = METHOD

    def to_dict(self) -> dict[str, Any]:
        """Plain values for JSON; unknown is None, never NaN."""
        return {**asdict(self), "warnings": list(self.warnings)}

    @classmethod
    def from_dict(cls, values: Mapping[str, Any]) -> CalibrationFigures:
        known = {field.name: values[field.name] for field in fields(cls) if field.name in values}
        return cls(**{**known, "warnings": tuple(values.get("warnings", ()))})


def calibrate(
    concentration_um: ArrayLike,
    current_na: ArrayLike,
    *,
    noise_na: float | None = None,
    standard_relative_uncertainty: float | None = None,
    weights: ArrayLike | None = None,
    through_zero: bool = False,
) -> CalibrationFigures:
    """The figures of one calibration from its points (n,): replicates included, in any order.

    noise_na: standard deviation of the signal at rest; where known, the detection limit rests on it.
    standard_relative_uncertainty: of the standard's concentration, one standard deviation.
    weights (n,): proportional to 1/variance; weights.py has the usual ones.
    through_zero: hold the line at zero. A single concentration leaves no other choice.

    Raises InputError for what can't be a point: a concentration below zero, a value that is no finite number.
    """
    x, y = _points(concentration_um, current_na)
    noise_na = _known("noise", noise_na)
    shared = _known("standard's relative uncertainty", standard_relative_uncertainty)
    if not (x > 0).any():
        return CalibrationFigures(n_points=len(x), warnings=(without_response(len(x)),))
    line = fit_line(x, y, through_zero=through_zero or len(levels_um(x)) == 1, weights=weights)
    curve = _curve_if_asked_for(line)
    found = _line_figures(line) if curve is None else _curve_figures(curve)
    found |= _interval(found, shared) if curve is not None else _interval_of_line(line, found, shared)
    if is_flat(line) or (line.degrees_of_freedom > 0 and line.exact()):
        found |= dict.fromkeys(_SCATTER)  # points without any scatter don't tell how sure their slope is
        found["r_squared"] = None if is_flat(line) else line.r_squared
    suspect = suspect_point(line) if curve is None else None
    outcome = Outcome(line, curve, suspect, noise_na)
    if outcome.responds:
        found |= _limits(found, noise_na, line) | {"linear_to_um": _linear_to_um(line, curve)}
    return CalibrationFigures(
        **{name: _none_if_nan(value) for name, value in found.items()},
        n_points=len(x),
        suspect_point=None if suspect is None else suspect.index,
        warnings=all_of(outcome, found.get("lod_um")),
    )


def factor_only(
    sensitivity_na_um: float,
    sensitivity_se_na_um: float | None = None,
    *,
    noise_na: float | None = None,
    standard_relative_uncertainty: float | None = None,
) -> CalibrationFigures:
    """An old record that kept the factor and not its points."""
    if not math.isfinite(sensitivity_na_um):
        raise InputError(f"the sensitivity is {sensitivity_na_um}; it must be a number of nA/µM")
    noise_na = _known("noise", noise_na)
    found: dict[str, Any] = {
        "sensitivity_na_um": float(sensitivity_na_um),
        "sensitivity_se_na_um": _known("sensitivity's standard error", sensitivity_se_na_um),
    }
    found |= _interval(found, _known("standard's relative uncertainty", standard_relative_uncertainty))
    found |= _limits(found, noise_na, None) if sensitivity_na_um > 0 else {}
    said = "only the factor was kept: without points its linearity, intercept and scatter are unknown"
    return CalibrationFigures(**found, warnings=(said,))


def _points(concentration_um: ArrayLike, current_na: ArrayLike) -> tuple[Array, Array]:
    x, y = np.array(concentration_um, dtype=float), np.array(current_na, dtype=float)
    if x.ndim != 1 or x.shape != y.shape:
        raise InputError(f"{x.size} concentrations and {y.size} currents don't pair up; each point needs one of both")
    for name, values in (("concentration", x), ("current", y)):
        bad = np.flatnonzero(~np.isfinite(values))
        if bad.size:
            raise InputError(
                f"the {name} of point {bad[0] + 1} is {values[bad[0]]}; a finite number is needed",
                "leave out a point that wasn't measured",
            )
    if (x < 0).any():
        raise InputError(
            f"the concentration of point {int(np.argmin(x)) + 1} is {x.min():g} µM; it can't be below zero"
        )
    return x, y


def _known(name: str, value: float | None) -> float | None:
    if value is not None and not (math.isfinite(value) and value >= 0):
        raise InputError(f"the {name} is {value}; a number of zero or more is needed, or none if unknown")
    return value or None


def _curve_if_asked_for(line: LineFit) -> SaturatingFit | None:
    """The isotherm, where the points bend down beyond chance and it really fits better than the line."""
    bent = curvature_p(line)
    if not (bent < BENT or (bent < BENT_WITH_LACK_OF_FIT and lack_of_fit(line).significant())):
        return None
    try:
        curve = fit_saturating(
            line.concentration_um, line.current_na, with_offset=not line.through_zero, weights=line.weights
        )
    except DataError:
        return None
    return curve if curve.residual_sd_na < line.residual_sd_na else None


_SCATTER = (
    "sensitivity_se_na_um",
    "sensitivity_se_shared_na_um",
    "sensitivity_low_na_um",
    "sensitivity_high_na_um",
    "intercept_se_na",
    "residual_sd_na",
)


def _line_figures(line: LineFit) -> dict[str, Any]:
    return {
        "shape": "line-through-zero" if line.through_zero else "line",
        "sensitivity_na_um": line.slope_na_um,
        "sensitivity_se_na_um": line.slope_se_na_um,
        "intercept_na": line.intercept_na,
        "intercept_se_na": None if line.through_zero else line.intercept_se_na,
        "residual_sd_na": line.residual_sd_na,
        "degrees_of_freedom": line.degrees_of_freedom,
        "r_squared": line.r_squared,
    }


def _curve_figures(curve: SaturatingFit) -> dict[str, Any]:
    return {
        "shape": "saturating",
        "sensitivity_na_um": curve.sensitivity_na_um,
        "sensitivity_se_na_um": curve.sensitivity_se_na_um,
        "intercept_na": curve.offset_na,
        "intercept_se_na": curve.offset_se_na or None,
        "residual_sd_na": curve.residual_sd_na,
        "degrees_of_freedom": curve.degrees_of_freedom,
        "r_squared": curve.r_squared,
    }


def _interval_of_line(line: LineFit, found: Mapping[str, Any], shared_relative: float | None) -> dict[str, Any]:
    plain = _interval(found, shared_relative)
    uneven = allowance(line)
    if uneven is None or not uneven.half_width_na_um > t_quantile(0.975, line.degrees_of_freedom) * line.slope_se_na_um:
        return plain
    half = math.hypot(uneven.half_width_na_um, 1.96 * (plain["sensitivity_se_shared_na_um"] or 0.0))
    return plain | {
        "sensitivity_low_na_um": line.slope_na_um - half,
        "sensitivity_high_na_um": line.slope_na_um + half,
        "interval_route": "scatter growing with the concentration, as the replicates suggest",
    }


def _interval(found: Mapping[str, Any], shared_relative: float | None) -> dict[str, Any]:
    """95 %: Student's t for the scatter of the points, 1.96 for the standard, joined as root of squares."""
    sensitivity, se = found["sensitivity_na_um"], found["sensitivity_se_na_um"]
    shared = None if shared_relative is None else abs(sensitivity) * shared_relative
    if se is None or math.isnan(se):
        return {"sensitivity_se_shared_na_um": shared}
    freedom = found.get("degrees_of_freedom")
    t = 1.96 if freedom is None else t_quantile(0.975, freedom)
    half = math.hypot(t * se, 1.96 * (shared or 0.0))
    return {
        "sensitivity_se_shared_na_um": shared,
        "sensitivity_low_na_um": sensitivity - half,
        "sensitivity_high_na_um": sensitivity + half,
    }


def _limits(found: Mapping[str, Any], noise_na: float | None, line: LineFit | None) -> dict[str, Any]:
    """By the signal's noise where known, else by the scatter of the points; unknown where they have none."""
    sensitivity = found["sensitivity_na_um"]
    if noise_na is not None:
        limits = from_noise(noise_na, sensitivity)
    elif line is not None and line.degrees_of_freedom > 0 and not line.exact():
        limits = from_residuals(found["residual_sd_na"] / math.sqrt(_lowest_weight(line)), sensitivity)
    else:
        return {}
    return {"lod_um": limits.lod_um, "loq_um": limits.loq_um, "lod_route": limits.route}


def _lowest_weight(line: LineFit) -> float:
    """Weighted points scatter least where they weigh most: a blank scatters as the lowest concentration does."""
    return float(line.weights[line.concentration_um == line.concentration_um.min()].mean())


def _linear_to_um(line: LineFit, curve: SaturatingFit | None) -> float | None:
    if curve is None:
        return linear_to_um(line)
    return min(curve.linear_to_um(LINEAR_SHARE), float(line.concentration_um.max()))


def _none_if_nan(value: Any) -> Any:
    return None if isinstance(value, float) and not math.isfinite(value) else value
