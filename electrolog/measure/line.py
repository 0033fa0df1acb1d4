"""The straight line from current against concentration: one, or a hundred thousand in one call."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from electrolog.errors import InputError

Array = NDArray[np.float64]
EXACT = 1e-13  # of the largest current


@dataclass(frozen=True)
class LineFits:
    """n lines; every field (n,). NaN: the points can't say (no spread, or no degree of freedom left)."""

    slope_na_um: Array
    slope_se_na_um: Array
    intercept_na: Array
    intercept_se_na: Array
    residual_sd_na: Array
    r_squared: Array
    centre_um: Array
    spread_um2: Array
    degrees_of_freedom: int

    def exact(self, current_na: Array) -> NDArray[np.bool_]:
        """(n,) of lines through currents (n, k), where the scatter is no more than the rounding of the arithmetic."""
        return np.asarray(self.residual_sd_na <= EXACT * np.abs(current_na).max(axis=-1))


@dataclass(frozen=True)
class LineFit:
    """One line with the points (n,) it came from.

    `centre_um` is the weighted mean concentration (0 through zero) and `spread_um2` the weighted sum of
    squares about it; weights have mean one, so that `residual_sd_na` belongs to a point of average weight.
    Through zero, `r_squared` is about zero, not about the mean, as in the certified no-intercept examples of
    the NIST StRD; it isn't comparable to that of a line with intercept.
    """

    slope_na_um: float
    slope_se_na_um: float
    intercept_na: float
    intercept_se_na: float
    residual_sd_na: float
    r_squared: float
    centre_um: float
    spread_um2: float
    degrees_of_freedom: int
    through_zero: bool
    concentration_um: Array
    current_na: Array
    weights: Array

    @property
    def n_points(self) -> int:
        return len(self.concentration_um)

    @property
    def residual_na(self) -> Array:
        return self.current_na - self.current_at(self.concentration_um)

    @property
    def slope_intercept_covariance(self) -> float:
        return -self.centre_um * self.slope_se_na_um**2

    def current_at(self, concentration_um: Array) -> Array:
        return self.intercept_na + self.slope_na_um * concentration_um

    def exact(self) -> bool:
        """True where the scatter is no more than the rounding of the arithmetic: no test can rest on it."""
        return bool(self.residual_sd_na <= EXACT * np.abs(self.current_na).max())


def fit_line(
    concentration_um: ArrayLike,
    current_na: ArrayLike,
    *,
    through_zero: bool = False,
    weights: ArrayLike | None = None,
) -> LineFit:
    """Ordinary or weighted least squares of current (n,) on concentration (n,).

    Weights (n,) are proportional to 1/variance; their scale doesn't matter.
    """
    x, y, w = _same_shape(concentration_um, current_na, weights)
    if x.ndim != 1:
        raise InputError(f"one line takes one row of points, not an array of shape {x.shape}")
    many = fit_lines(x[None], y[None], through_zero=through_zero, weights=w[None])
    return LineFit(
        slope_na_um=float(many.slope_na_um[0]),
        slope_se_na_um=float(many.slope_se_na_um[0]),
        intercept_na=float(many.intercept_na[0]),
        intercept_se_na=float(many.intercept_se_na[0]),
        residual_sd_na=float(many.residual_sd_na[0]),
        r_squared=float(many.r_squared[0]),
        centre_um=float(many.centre_um[0]),
        spread_um2=float(many.spread_um2[0]),
        degrees_of_freedom=many.degrees_of_freedom,
        through_zero=through_zero,
        concentration_um=x,
        current_na=y,
        weights=w * (w.size / w.sum()),
    )


def fit_lines(
    concentration_um: ArrayLike,
    current_na: ArrayLike,
    *,
    through_zero: bool = False,
    weights: ArrayLike | None = None,
) -> LineFits:
    """n lines of k points each: concentration (k,) or (n, k), current (n, k), weights (k,) or (n, k).

    Orthogonal decomposition: the concentrations are made orthogonal to the constant (centred) before the
    slope is projected out, and both steps are done twice. Textbook sums of squares would lose the digits of
    data that lie far from zero.
    """
    x, y, w = _same_shape(concentration_um, current_na, weights)
    w = w * (w.shape[-1] / w.sum(axis=-1, keepdims=True))
    freedom = x.shape[-1] - (1 if through_zero else 2)
    centre_um, xc = _centred(x, w, through_zero)
    centre_na, yc = _centred(y, w, through_zero)
    spread_um2, total_na2 = _dot(w, xc, xc), _dot(w, yc, yc)
    with np.errstate(divide="ignore", invalid="ignore"):
        slope = _dot(w, xc, yc) / spread_um2
        slope += _dot(w, xc, yc - slope[:, None] * xc) / spread_um2
        residual = yc - slope[:, None] * xc
        rest_na2 = _dot(w, residual, residual)
        sd = np.sqrt(rest_na2 / freedom) if freedom > 0 else np.full_like(slope, np.nan)
        sd = np.where(np.isfinite(slope), sd, np.nan)
        intercept_se = sd * np.sqrt(1 / x.shape[-1] + centre_um**2 / spread_um2)
        return LineFits(
            slope_na_um=np.where(spread_um2 > 0, slope, np.nan),
            slope_se_na_um=sd / np.sqrt(spread_um2),
            intercept_na=np.zeros_like(slope) if through_zero else centre_na - slope * centre_um,
            intercept_se_na=np.zeros_like(slope) if through_zero else intercept_se,
            residual_sd_na=sd,
            r_squared=1 - rest_na2 / total_na2 if freedom > 0 else np.full_like(slope, np.nan),
            centre_um=centre_um,
            spread_um2=spread_um2,
            degrees_of_freedom=max(freedom, 0),
        )


def levels_um(concentration_um: Array) -> Array:
    """The different concentrations, rising. (numpy's own unique loads masked arrays: 8 ms at a first call.)"""
    return np.array(sorted(set(concentration_um.tolist())))


def _centred(values: Array, weights: Array, through_zero: bool) -> tuple[Array, Array]:
    if through_zero:
        return np.zeros(len(values)), values
    mean = _dot(weights, values) / values.shape[-1]
    mean += _dot(weights, values - mean[:, None]) / values.shape[-1]
    return mean, values - mean[:, None]


def _dot(*rows: Array) -> Array:
    product = rows[0]
    for row in rows[1:]:
        product = product * row
    total: Array = product.sum(axis=-1)
    return total


def _same_shape(
    concentration_um: ArrayLike, current_na: ArrayLike, weights: ArrayLike | None
) -> tuple[Array, Array, Array]:
    x, y = np.asarray(concentration_um, dtype=float), np.asarray(current_na, dtype=float)
    w = np.ones(1) if weights is None else np.asarray(weights, dtype=float)
    if x.shape[-1:] != y.shape[-1:] or y.size == 0:
        raise InputError(f"concentrations {x.shape} and currents {y.shape} don't pair up; each point needs one of both")
    if not (np.isfinite(w).all() and (w > 0).all()):
        raise InputError("a weight is zero, negative or not a number; each must be above zero")
    x, y, w = np.broadcast_arrays(x, y, w)
    return x, y, w
