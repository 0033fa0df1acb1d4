"""How often to recalibrate: the methods of OIML D 10 / ILAC-G24, in calendar hours or hours of use alike.

The guide names five ways: the staircase, the control chart, time in use, checks in service, and statistical ones. Here
are the arithmetic ones; time in use is any of them with hours of run instead of hours of the clock.
"""

from __future__ import annotations

import math

import numpy as np
from numpy.typing import ArrayLike

from electrolog.errors import InputError

WELL_INSIDE = 0.8  # of the permitted error; the guide's example


def staircase(interval_h: float, error_share: float, *, longer: float = 1.1, shorter: float = 0.75) -> float:
    """The next interval from how much of the permitted error was used up (error / permitted, either sign)."""
    used = abs(error_share)
    if used <= WELL_INSIDE:
        return interval_h * longer
    return interval_h if used <= 1 else interval_h * shorter


def chart_interval_h(hours: ArrayLike, error_share: ArrayLike, *, margin: float = 2.0) -> float | None:
    """Control chart: time for the drift to use up the permitted error, less `margin` deviations of the scatter.

    hours, error_share: (n,) since adjustment, error as a share of the permitted one. None: no drift can be told from
    the scatter (slope within `margin` standard errors of nothing), so the chart sets no limit.
    """
    x, y = np.asarray(hours, dtype=float), np.asarray(error_share, dtype=float)
    if x.shape != y.shape or x.size < 3:
        raise InputError(f"{x.size} times and {y.size} errors; at least three pairs are needed to see a drift")
    centred = x - x.mean()
    slope = float(centred @ y / (centred @ centred))
    residual = y - y.mean() - slope * centred
    sd = math.sqrt(float(residual @ residual) / (x.size - 2))
    if abs(slope) <= margin * sd / math.sqrt(float(centred @ centred)):
        return None
    return max(0.0, (1 - margin * sd) / abs(slope))


def simple_response(interval_h: float, in_tolerance: bool, *, longer: float = 0.1, target: float = 0.9) -> float:
    """Lengthen by a share when in tolerance, shorten when not, balanced at the target share (NCSL RP-1)."""
    return interval_h * (1 + longer if in_tolerance else 1 - shortening(longer, target))


def shortening(longer: float, target: float) -> float:
    """The share b for which (1 + a)^R · (1 − b)^(1 − R) = 1."""
    return float(1 - (1 + longer) ** (-target / (1 - target)))


def exponential_interval_h(interval_h: float, observed: float, target: float) -> float:
    """For a share in tolerance that falls as exp(−t/θ): the interval at which it would be the target.

    Raises InputError where none or all were in tolerance: then the share says nothing of θ.
    """
    if not (0 < observed < 1 and 0 < target < 1):
        raise InputError(f"a share in tolerance of {observed:g} at a target of {target:g}; accepted: between 0 and 1")
    return interval_h * math.log(target) / math.log(observed)


def exact_share_interval(found: int, of: int, confidence: float = 0.95) -> tuple[float, float]:
    """Clopper & Pearson, Biometrika 26 (1934) 404."""
    from scipy.special import betaincinv

    tail = (1 - confidence) / 2
    low = float(betaincinv(found, of - found + 1, tail)) if found else 0.0
    return low, float(betaincinv(found + 1, of - found, 1 - tail)) if found < of else 1.0


def keeps_interval(found: int, of: int, target: float, confidence: float = 0.95) -> bool:
    """Binomial test: keep the interval while the target isn't refuted by how many were in tolerance."""
    low, high = exact_share_interval(found, of, confidence)
    return low <= target <= high
