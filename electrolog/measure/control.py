"""Control charts of a check standard or check probe: is this rig still what it was?

Constants and rules as published: the NIST/SEMATECH e-Handbook of Statistical Methods, chapter 6.3.2, and
Montgomery, Introduction to Statistical Quality Control (d2 = 1.128 and D4 = 3.267 for ranges of two; the
Western Electric rules; Roberts' EWMA; Page's CUSUM with k = 0.5 and h = 5 standard deviations).
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from electrolog.errors import DataError, InputError

Array = NDArray[np.float64]

D2_OF_TWO = 1.128
D4_OF_TWO = 3.267


@dataclass(frozen=True)
class Chart:
    """A charted statistic (n,), its limits (n,), and the rules broken: (index of the point, rule)."""

    statistic: Array
    centre: float
    lower: Array
    upper: Array
    signals: tuple[tuple[int, str], ...]


def individuals(values: ArrayLike, baseline: int | None = None) -> Chart:
    """Mean ± 3·MR̄/d2. baseline: how many of the first points set the limits (default: all)."""
    x = _series(values)
    base = x[:baseline]
    centre, sd = float(base.mean()), _mean_range(base) / D2_OF_TWO
    signals = _western_electric((x - centre) / sd) if sd > 0 else ()
    return Chart(x, centre, np.full(x.size, centre - 3 * sd), np.full(x.size, centre + 3 * sd), signals)


def moving_range(values: ArrayLike, baseline: int | None = None) -> Chart:
    """|x[i] − x[i−1]| (n−1 values) against D4·MR̄."""
    x = _series(values)
    ranges, mean = np.abs(np.diff(x)), _mean_range(x[:baseline])
    upper = np.full(ranges.size, D4_OF_TWO * mean)
    signals = tuple((int(i) + 1, "a jump beyond the range's limit") for i in np.flatnonzero(ranges > upper))
    return Chart(ranges, mean, np.zeros(ranges.size), upper, signals)


def ewma(values: ArrayLike, target: float, sd: float, *, weight: float = 0.2, width: float = 3.0) -> Chart:
    """z[0] = target; z[i] = λ·x[i] + (1−λ)·z[i−1]; limits target ± width·sd·√(λ/(2−λ)·(1−(1−λ)^2i)).

    The statistic has n + 1 values, the target first; the limits widen to the steady ones.
    """
    x = _series(values)
    _refuse_unless_positive(sd, weight, width)
    if weight > 1:
        raise InputError(f"an EWMA's weight must be above 0 and at most 1; found {weight:g}")
    smoothed = np.empty(x.size + 1)
    smoothed[0] = target
    for i, value in enumerate(x):
        smoothed[i + 1] = weight * value + (1 - weight) * smoothed[i]
    steps = np.arange(x.size + 1)
    half = width * sd * np.sqrt(weight / (2 - weight) * (1 - (1 - weight) ** (2 * steps)))
    beyond = np.flatnonzero(np.abs(smoothed - target)[1:] > half[1:])
    signals = tuple((int(i), "the smoothed value is beyond its limit") for i in beyond)
    return Chart(smoothed, target, target - half, target + half, signals)


@dataclass(frozen=True)
class Cusum:
    """Sums of what lies above and below the target (n,), the limit, and the points where one passes it."""

    high: Array
    low: Array
    limit: float
    signals: tuple[tuple[int, str], ...]


def cusum(values: ArrayLike, target: float, sd: float, *, slack: float = 0.5, limit: float = 5.0) -> Cusum:
    """Tabular CUSUM; slack k and limit h in standard deviations."""
    x = _series(values)
    _refuse_unless_positive(sd, slack, limit)
    high, low = np.zeros(x.size), np.zeros(x.size)
    above = below = 0.0
    for i, off in enumerate(x - target):
        above, below = max(0.0, above + off - slack * sd), max(0.0, below - off - slack * sd)
        high[i], low[i] = above, below
    signals = tuple(
        (i, f"drifted {'up' if high[i] > limit * sd else 'down'}")
        for i in range(x.size)
        if max(high[i], low[i]) > limit * sd
    )
    return Cusum(high, low, limit * sd, signals)


def _western_electric(z: Array) -> tuple[tuple[int, str], ...]:
    """The four rules, each counted on one side of the centre; a rule is broken at the last point it needs."""
    rules = (
        (1, 1, 3.0, "beyond 3 standard deviations"),
        (2, 3, 2.0, "two of three beyond 2 standard deviations"),
        (4, 5, 1.0, "four of five beyond 1 standard deviation"),
        (8, 8, 0.0, "eight in a row on one side"),
    )
    found = []
    for needed, span, bound, text in rules:
        for side in (1, -1):
            beyond = side * z > bound
            found += [
                (i, text) for i in range(z.size) if beyond[i] and beyond[max(0, i - span + 1) : i + 1].sum() >= needed
            ]
    return tuple(sorted(found))


def _mean_range(x: Array) -> float:
    return float(np.abs(np.diff(x)).mean())


def _series(values: ArrayLike) -> Array:
    x = np.asarray(values, dtype=float)
    if x.ndim != 1 or x.size < 2:
        raise DataError(f"a control chart needs two points or more, in one row; found shape {x.shape}")
    if not np.isfinite(x).all():
        raise InputError("a value of the control chart is no finite number")
    return x


def _refuse_unless_positive(*values: float) -> None:
    if not all(math.isfinite(value) and value > 0 for value in values):
        raise InputError("the chart's standard deviation, weight, slack and limits must be above zero")
