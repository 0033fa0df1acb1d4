"""The adsorption isotherm: current that levels off as the surface fills.

i = offset + i_max·K·c / (1 + K·c)      (Langmuir, J. Am. Chem. Soc. 40 (1918) 1361)

offset nA, i_max nA, K 1/µM, c µM. The sensitivity is its slope at low concentration, s = i_max·K nA/µM.
Fitted as s, K, offset: for a given K the rest is a straight line in c/(1 + K·c); K = 0 is the line itself.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from electrolog.errors import DataError
from electrolog.measure.least_squares import LeastSquares, least_squares
from electrolog.measure.line import fit_lines, levels_um

Array = NDArray[np.float64]


@dataclass(frozen=True)
class SaturatingFit:
    """`sensitivity_na_um` is the slope at low concentration; `current_max_na` is above the offset."""

    sensitivity_na_um: float
    sensitivity_se_na_um: float
    affinity_per_um: float
    affinity_se_per_um: float
    current_max_na: float
    current_max_se_na: float
    offset_na: float
    offset_se_na: float
    residual_sd_na: float
    r_squared: float
    degrees_of_freedom: int

    def linear_to_um(self, share: float) -> float:
        """Where the current falls short of the low-concentration slope by `share`."""
        return share / (1 - share) / self.affinity_per_um


def fit_saturating(
    concentration_um: ArrayLike,
    current_na: ArrayLike,
    *,
    with_offset: bool = True,
    weights: ArrayLike | None = None,
) -> SaturatingFit:
    """Least squares of the isotherm on points (n,). Raises DataError where the points show no saturation."""
    x, y = np.asarray(concentration_um, dtype=float), np.asarray(current_na, dtype=float)
    w = np.ones_like(x) if weights is None else np.asarray(weights, dtype=float)
    w = w * (w.size / w.sum())
    levels = len(levels_um(x))
    if levels < 4:
        raise DataError(f"a saturating shape needs four concentrations or more; found {levels}")
    start = _start(x, y, w, with_offset)
    parameters, last = _refined(start, x, y, w)
    return _figures(parameters, last, y, w)


def _start(x: Array, y: Array, w: Array, with_offset: bool) -> Array:
    """The best of many K, each with its own straight line: no local minimum can trap the search."""
    affinity = np.geomspace(1e-4, 1e4, 97) / x.max()
    shrunk = x / (1 + affinity[:, None] * x)
    many = fit_lines(shrunk, y[None], through_zero=not with_offset, weights=w[None])
    best = int(np.nanargmin(many.residual_sd_na))
    if best in (0, len(affinity) - 1):
        raise DataError("the points show no saturation that could be measured", "fit a straight line")
    sensitivity, offset = many.slope_na_um[best], many.intercept_na[best]
    return np.array([sensitivity, affinity[best]] + ([offset] if with_offset else []))


def _refined(parameters: Array, x: Array, y: Array, w: Array) -> tuple[Array, LeastSquares]:
    """Gauss–Newton with halved steps; each step is a least-squares problem of its own."""
    for _ in range(100):
        step = least_squares(_jacobian(parameters, x), y - _current(parameters, x), w, refinements=0)
        share = _downhill(parameters, step.coefficient, x, y, w)
        parameters = parameters + share * step.coefficient
        if np.abs(share * step.coefficient).max() <= 1e-13 * np.abs(parameters).max() or share < 1e-12:
            break
    return parameters, least_squares(_jacobian(parameters, x), y - _current(parameters, x), w)


def _downhill(parameters: Array, step: Array, x: Array, y: Array, w: Array) -> float:
    before, share = _misfit(parameters, x, y, w), 1.0
    while share > 1e-12 and not _misfit(parameters + share * step, x, y, w) <= before * (1 + 1e-12):
        share /= 2
    return share


def _misfit(parameters: Array, x: Array, y: Array, w: Array) -> float:
    return float(w @ (y - _current(parameters, x)) ** 2) if parameters[1] > 0 else math.inf


def _current(parameters: Array, x: Array) -> Array:
    offset = parameters[2] if len(parameters) == 3 else 0.0
    current: Array = offset + parameters[0] * x / (1 + parameters[1] * x)
    return current


def _jacobian(parameters: Array, x: Array) -> Array:
    shrunk = x / (1 + parameters[1] * x)
    columns = [shrunk, -parameters[0] * shrunk**2] + ([np.ones_like(x)] if len(parameters) == 3 else [])
    return np.column_stack(columns)


def _figures(parameters: Array, last: LeastSquares, y: Array, w: Array) -> SaturatingFit:
    sensitivity, affinity = float(parameters[0]), float(parameters[1])
    gradient = np.array([1 / affinity, -sensitivity / affinity**2])  # of i_max = s / K
    current_max_variance = float(gradient @ last.covariance[:2, :2] @ gradient)
    se = [float(value) for value in last.standard_error] + [0.0]
    about_mean = float(w @ (y - float(w @ y) / len(y)) ** 2)
    return SaturatingFit(
        sensitivity_na_um=sensitivity,
        sensitivity_se_na_um=se[0],
        affinity_per_um=affinity,
        affinity_se_per_um=se[1],
        current_max_na=sensitivity / affinity,
        current_max_se_na=math.sqrt(current_max_variance),
        offset_na=float(parameters[2]) if len(parameters) == 3 else 0.0,
        offset_se_na=se[2],
        residual_sd_na=last.residual_sd,
        r_squared=1 - float(w @ last.residual**2) / about_mean,
        degrees_of_freedom=last.degrees_of_freedom,
    )
