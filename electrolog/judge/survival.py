"""How long probes last until retirement, the ones still in use counted as not yet retired."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import ArrayLike, NDArray

from electrolog.errors import InputError

Array = NDArray[np.float64]


@dataclass(frozen=True)
class SurvivalCurve:
    """Kaplan–Meier: share still alive after each time at which something happened, with a pointwise interval.

    The interval is Greenwood's on the scale log(−log S), which stays within 0 and 1 (Kalbfleisch & Prentice);
    NaN where nothing has been lost yet or nothing is left. median and its limits: None where the curve, or that side
    of its band, doesn't come down to one half.
    """

    time: Array
    at_risk: NDArray[np.int64]
    lost: NDArray[np.int64]
    alive: Array
    low: Array
    high: Array
    median: float | None
    median_low: float | None
    median_high: float | None

    def at(self, time: float) -> float:
        """Share alive after that time."""
        before = np.searchsorted(self.time, time, side="right")
        return float(self.alive[before - 1]) if before else 1.0


def survival(time: ArrayLike, lost: ArrayLike, confidence: float = 0.95) -> SurvivalCurve:
    """From each probe's time (n,) to its end (lost) or to now (still in use). Raises InputError for a negative time."""
    import warnings

    from scipy.stats import CensoredData, ecdf

    times, ended = _checked(time, lost)
    sample = CensoredData(uncensored=times[ended], right=times[~ended])
    alive = ecdf(sample).sf
    with warnings.catch_warnings():
        warnings.simplefilter("ignore", RuntimeWarning)  # where nothing was lost yet the band is NaN, which is right
        # Any: the published types take its two sides, which are curves, for numbers
        band: Any = alive.confidence_interval(confidence, method="log-log")
    grid = np.asarray(alive.quantiles, dtype=np.float64)
    share = np.asarray(alive.probabilities, dtype=np.float64)
    low, high = (np.asarray(side.probabilities, dtype=np.float64) for side in (band.low, band.high))
    return SurvivalCurve(
        grid,
        np.array([(times >= moment).sum() for moment in grid]),
        np.array([(times[ended] == moment).sum() for moment in grid]),
        share,
        low,
        high,
        _median(grid, share),
        _median(grid, low),
        _median(grid, high),
    )


def _checked(time: ArrayLike, lost: ArrayLike) -> tuple[Array, NDArray[np.bool_]]:
    times, ended = np.asarray(time, dtype=float), np.asarray(lost, dtype=bool)
    if times.shape != ended.shape or times.ndim != 1 or not times.size:
        raise InputError(f"{times.size} times and {ended.size} ends don't pair up; each probe needs one of both")
    if not (np.isfinite(times) & (times >= 0)).all():
        raise InputError("a time to retirement is negative or unknown; accepted: zero or more")
    return times, ended


def _median(time: Array, share: Array) -> float | None:
    """First time at or below one half; halfway along, where the curve rests exactly on it."""
    reached = np.flatnonzero(share <= 0.5 + 1e-12)
    if not reached.size:
        return None
    first = reached[0]
    lower = np.flatnonzero(share < 0.5 - 1e-12)
    if abs(share[first] - 0.5) < 1e-12 and lower.size:
        return float((time[first] + time[lower[0]]) / 2)
    return float(time[first])


@dataclass(frozen=True)
class LogRank:
    """Mantel's log-rank test of k groups: observed and expected losses, chi-square on k − 1 degrees of freedom."""

    observed: Array
    expected: Array
    chi_square: float
    degrees_of_freedom: int
    p: float


def log_rank(groups: Sequence[tuple[ArrayLike, ArrayLike]] | Mapping[str, tuple[ArrayLike, ArrayLike]]) -> LogRank:
    """Of any number of groups, each (times, lost), where scipy's own takes two.

    N. Mantel, Cancer Chemother. Rep. 50 (1966) 163. Raises InputError for fewer than two groups.
    """
    from scipy.special import chdtrc

    pairs = [_checked(*pair) for pair in (groups.values() if isinstance(groups, Mapping) else groups)]
    if len(pairs) < 2:
        raise InputError("one group can't be compared; at least two are needed")
    moments = np.unique(np.concatenate([times[ended] for times, ended in pairs]))
    risk = np.array([(times[:, None] >= moments).sum(axis=0) for times, _ in pairs], dtype=float)
    lost = np.array([(times[ended][:, None] == moments).sum(axis=0) for times, ended in pairs], dtype=float)
    observed, expected = lost.sum(axis=1), (risk * lost.sum(axis=0) / risk.sum(axis=0)).sum(axis=1)
    apart = (observed - expected)[1:]
    chi_square = float(apart @ np.linalg.pinv(_covariance(risk, lost)[1:, 1:]) @ apart)
    return LogRank(observed, expected, chi_square, len(pairs) - 1, float(chdtrc(len(pairs) - 1, chi_square)))


def _covariance(risk: Array, lost: Array) -> Array:
    """Hypergeometric, summed over the moments of loss."""
    at_risk, died = risk.sum(axis=0), lost.sum(axis=0)
    share = risk / at_risk
    factor = died * (at_risk - died) / np.maximum(at_risk - 1, 1)
    return np.asarray(np.diag((share * factor).sum(axis=1)) - (share * factor) @ share.T)
