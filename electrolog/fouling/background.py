"""Whether the background charging current tells of the sensitivity, and what it then adds to a forecast.

A published way to calibrate in place regresses sensitivity on the background current, S = a + b B (the idea is stated
from memory). Here in logs and within a probe, so that no probe's size enters: a change of log B is c0 + c1 times the
change of log S, and a normal error. Every lab learns its own c0, c1 and error, and takes the law only where it betters
the forecasts of probes that it was not learned from.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from electrolog.fouling.points import even_points

Floats = NDArray[np.float64]
Integers = NDArray[np.int64]
FEWEST_PAIRS, FEWEST_PROBES = 20, 8
NO_FOULING = 0.7  # a reading that misses its forecast by a factor of two is a slip or damage: it teaches no law
SURE = 1.645  # standard errors by which forecasts must be better: one chance in twenty of taking a law for nothing


@dataclass(frozen=True)
class Pairs:
    """N pairs of successive readings of a probe: forecast draws of the change of log S (N, D), the change as read (N,),
    the sd of one such reading (D,), the change of log B (N,), and whose they are (N,). smoothed (N,): the expected
    true change, all readings known; a law learned from readings with their own errors would come out too flat.
    """

    forecast: Floats
    reading: Floats
    smoothed: Floats
    reading_sd: Floats
    background: Floats
    probe: Integers


@dataclass(frozen=True)
class Law:
    """change of log B = intercept + slope * change of log S + N(0, sd²)."""

    intercept: float
    slope: float
    sd: float


@dataclass(frozen=True)
class Trial:
    """law: None where it isn't used, and `said` tells why. better: mean gain of CRPS on probes left out, and its se."""

    law: Law | None
    pairs: int
    better: float
    better_se: float
    said: str


def tried(pairs: Pairs) -> Trial:
    """Learns the law from all probes but one and forecasts that one's readings with it, for every probe in turn."""
    kept = np.abs(pairs.reading - np.median(pairs.forecast, axis=1)) < NO_FOULING
    probes = np.unique(pairs.probe[kept])
    count = int(kept.sum())
    if count < FEWEST_PAIRS or len(probes) < FEWEST_PROBES:
        said = f"{count} pairs of {len(probes)} probes hold a background; {FEWEST_PAIRS} of {FEWEST_PROBES} are needed"
        return Trial(None, count, 0.0, 0.0, f"the background isn't used: {said}")
    gains = np.array([_gain(pairs, kept, probe) for probe in probes])
    better, se = float(gains.mean()), float(gains.std(ddof=1) / np.sqrt(len(gains)))
    if better < SURE * se or better <= 0.0:
        said = "on probes it wasn't learned from it didn't better this lab's forecasts"
        return Trial(None, count, better, se, f"the background isn't used: {said}")
    law = _learned(pairs, kept)
    said = f"the background sharpens it: {count} pairs of {len(probes)} probes say that it helps in this lab"
    return Trial(law, count, better, se, said)


def resampled(law: Law, change: Floats, background_change: float) -> Integers:
    """(D,) which draws of the change of log S stand for what is known once the background's change is known."""
    misfit = (background_change - law.intercept - law.slope * change) / law.sd
    weight = np.exp(-0.5 * (misfit**2 - np.min(misfit**2)))
    steps = np.cumsum(weight) / weight.sum()
    ranks = (np.arange(len(change)) + 0.5) / len(change)
    return np.minimum(np.searchsorted(steps, ranks), len(change) - 1).astype(np.int64)


def _learned(pairs: Pairs, among: NDArray[np.bool_]) -> Law:
    x, y = pairs.smoothed[among], pairs.background[among]
    slope, intercept = np.polyfit(x, y, 1)
    sd = float(np.sqrt(np.sum((y - intercept - slope * x) ** 2) / (len(x) - 2)))
    return Law(float(intercept), float(slope), max(sd, 1e-4))


def _gain(pairs: Pairs, kept: NDArray[np.bool_], probe: int) -> float:
    law = _learned(pairs, kept & (pairs.probe != probe))
    gains = [_gain_of(pairs, law, int(k)) for k in np.flatnonzero(kept & (pairs.probe == probe))]
    return float(np.mean(gains))


def _gain_of(pairs: Pairs, law: Law, k: int) -> float:
    from scipy.special import ndtri

    change = pairs.forecast[k]
    noise = pairs.reading_sd * ndtri(even_points(len(change), 1)[:, 0])
    with_it = resampled(law, change, float(pairs.background[k]))
    return _crps(change + noise, pairs.reading[k]) - _crps(change[with_it] + noise, pairs.reading[k])


def _crps(draws: Floats, truth: float) -> float:
    """Mean distance from the truth less half the mean distance between two draws."""
    ordered = np.sort(draws)
    count = len(ordered)
    ranks = 2 * np.arange(count) - count + 1
    return float(np.abs(draws - truth).mean() - (ordered * ranks).sum() / (count * (count - 1)))
