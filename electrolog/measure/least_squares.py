"""Linear least squares for any design, by orthogonal decomposition of the scaled design."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from electrolog.errors import DataError

Array = NDArray[np.float64]


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


def least_squares(design: Array, response: Array, weights: Array | None = None) -> LeastSquares:
    """Fits response (n,) = design (n, p) @ coefficient; weights (n,) are proportional to 1/variance.

    QR of columns scaled to length one, then one step of refinement. The normal equations would square the
    condition number and lose half of the digits. Raises DataError when the columns don't determine the
    coefficients.
    """
    root = np.ones(len(response)) if weights is None else np.sqrt(weights * len(weights) / weights.sum())
    weighted, target = design * root[:, None], response * root
    scale = np.linalg.norm(weighted, axis=0)
    scale[scale == 0] = 1.0
    q, r = np.linalg.qr(weighted / scale)
    _refuse_rank_loss(r)
    scaled = np.linalg.solve(r, q.T @ target)
    scaled += np.linalg.solve(r, q.T @ (target - (weighted / scale) @ scaled))
    residual = target - (weighted / scale) @ scaled
    freedom = len(response) - design.shape[1]
    variance = float(residual @ residual) / freedom if freedom > 0 else float("nan")
    half = np.linalg.solve(r, np.eye(len(r))) / scale[:, None]
    return LeastSquares(scaled / scale, variance * (half @ half.T), residual / root, variance**0.5, freedom)


def _refuse_rank_loss(r: Array) -> None:
    if r.shape[0] < r.shape[1] or np.abs(np.diag(r)).min() < 1e-13:
        raise DataError(
            "the points don't determine the curve: its parameters can't be told apart",
            "measure more, or wider spread, concentrations",
        )
