"""Linear least squares for any design, by orthogonal decomposition and refinement with exact residuals."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from electrolog.errors import DataError

Array = NDArray[np.float64]

REFINEMENTS = 2  # each gains as many digits as the decomposition itself is good for


@dataclass(frozen=True)
class LeastSquares:
    """`coefficient` (p,), its `covariance` (p, p) and the residuals (n,), in the units of the data.

    The covariance is NaN where no degree of freedom is left: no scatter, no uncertainty.
    """

    coefficient: Array
    covariance: Array
    residual: Array
    residual_sd: float
    degrees_of_freedom: int

    @property
    def standard_error(self) -> Array:
        return np.sqrt(np.diag(self.covariance))


def least_squares(
    design: Array, response: Array, weights: Array | None = None, *, refinements: int = REFINEMENTS
) -> LeastSquares:
    """Fits response (n,) = design (n, p) @ coefficient; weights (n,) are proportional to 1/variance.

    QR of the columns scaled to length one: the normal equations would square the condition number and lose
    half of the digits. Raises DataError when the columns don't determine the coefficients.
    """
    root = np.ones(len(response)) if weights is None else np.sqrt(weights * len(weights) / weights.sum())
    weighted, target = design * root[:, None], response * root
    scale = _column_scale(weighted)
    weighted = weighted / scale
    q, r = np.linalg.qr(weighted)
    _refuse_rank_loss(r)
    scaled = np.linalg.solve(r, q.T @ target)
    residual = target - weighted @ scaled
    for _ in range(refinements):
        scaled, residual = _refined(weighted, target, q, r, scaled, residual)
    freedom = len(response) - design.shape[1]
    variance = float(residual @ residual) / freedom if freedom > 0 else math.nan
    half = np.linalg.inv(r) / scale[:, None]
    return LeastSquares(scaled / scale, variance * (half @ half.T), residual / root, math.sqrt(variance), freedom)


def _column_scale(design: Array) -> Array:
    """Powers of two near the columns' lengths: dividing by them rounds nothing."""
    length = np.linalg.norm(design, axis=0)
    return np.exp2(np.round(np.log2(np.where(length > 0, length, 1.0))))


def _refined(
    design: Array, target: Array, q: Array, r: Array, coefficient: Array, residual: Array
) -> tuple[Array, Array]:
    """One step for coefficient and residual together (Björck, BIT 7 (1967) 257).

    Refining the coefficients alone would stop at the rounding of a large residual.
    """
    misfit = np.array(
        [
            _exact_dot(np.append(row, 1.0), np.append(-coefficient, -own), extra=value)
            for row, own, value in zip(design, residual, target, strict=True)
        ]
    )
    skew = np.array([-_exact_dot(column, residual) for column in design.T])
    along, across = q.T @ misfit, np.linalg.solve(r.T, skew)
    return coefficient + np.linalg.solve(r, along - across), residual + misfit + q @ (across - along)


def _exact_dot(a: Array, b: Array, extra: float = 0.0) -> float:
    """Σ a·b + extra, rounded once: each product with its rounding error (Dekker, Numer. Math. 18 (1971) 224)."""
    product = a * b
    (a_high, a_low), (b_high, b_low) = _halves(a), _halves(b)
    error = ((a_high * b_high - product) + a_high * b_low + a_low * b_high) + a_low * b_low
    return math.fsum([extra, *product.tolist(), *error.tolist()])


def _halves(a: Array) -> tuple[Array, Array]:
    shifted = a * 134217729.0  # 2**27 + 1
    high = shifted - (shifted - a)
    return high, a - high


def _refuse_rank_loss(r: Array) -> None:
    diagonal = np.abs(np.diag(r))
    if r.shape[0] < r.shape[1] or diagonal.min() < 1e-13 * diagonal.max():
        raise DataError(
            "the points don't determine the curve: its parameters can't be told apart",
            "measure more, or wider spread, concentrations",
        )
