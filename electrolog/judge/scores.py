"""How good forecasts were, once the truth or the next reading is known: for the backtest."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]


def crps(draws: Array, truth: Array) -> Array:
    """(N, D) draws and (N,) truths -> (N,) continuous ranked probability scores, in the draws' unit; less is better.

    The mean distance of a draw from the truth, less half the mean distance between two different draws (the unbiased
    form: Ferro, Meteorol. Appl. 21 (2014) 1324; the score: Gneiting & Raftery, JASA 102 (2007) 359).
    """
    ordered = np.sort(draws, axis=-1)
    count = ordered.shape[-1]
    ranks = 2 * np.arange(count) - count + 1
    apart = (ordered * ranks).sum(axis=-1) / (count * (count - 1))
    return np.asarray(np.abs(draws - truth[:, None]).mean(axis=-1) - apart)


def log_score(draws: Array, reading: Array, reading_sd: Array) -> Array:
    """(N,) minus log density of the forecast at a reading whose error about the truth is normal; less is better."""
    from scipy.special import logsumexp

    misfit = (reading[:, None] - draws) / reading_sd[:, None]
    densities = -0.5 * misfit**2 - np.log(reading_sd * np.sqrt(2 * np.pi))[:, None]
    return -np.asarray(logsumexp(densities, axis=-1) - np.log(draws.shape[-1]), dtype=float)


def pit(draws: Array, truth: Array) -> Array:
    """(N,) share of the draws below the truth, even over 0..1 when the forecasts are honest."""
    below = (draws < truth[:, None]).sum(axis=-1) + 0.5 * (draws == truth[:, None]).sum(axis=-1)
    return np.asarray((below + 0.5) / (draws.shape[-1] + 1))


@dataclass(frozen=True)
class Coverage:
    """Share of the truths within the central interval of that level, with a 95 % interval of the share itself."""

    level: float
    share: float
    low: float
    high: float
    count: int
    mean_width: float


def coverage(draws: Array, truth: Array, level: float = 0.9) -> Coverage:
    ends = np.quantile(draws, [(1 - level) / 2, (1 + level) / 2], axis=-1)
    inside = int(((truth >= ends[0]) & (truth <= ends[1])).sum())
    low, high = share_interval(inside, len(truth))
    return Coverage(level, inside / len(truth), low, high, len(truth), float((ends[1] - ends[0]).mean()))


def share_interval(found: int, of: int, confidence: float = 0.95) -> tuple[float, float]:
    """Wilson's interval of a share (JASA 22 (1927) 209); nothing tried: anywhere."""
    from scipy.special import ndtri

    if of == 0:
        return 0.0, 1.0
    z2, p = float(ndtri((1 + confidence) / 2)) ** 2, found / of
    middle, half = (p + z2 / (2 * of)) / (1 + z2 / of), np.sqrt(z2 * (p * (1 - p) + z2 / (4 * of)) / of) / (1 + z2 / of)
    return max(0.0, float(middle - half)), min(1.0, float(middle + half))


@dataclass(frozen=True)
class OddsScore:
    """Of stated odds: their mean squared error (Brier), and per class of stated odds what came true."""

    brier: float
    classes: tuple[tuple[float, float, int], ...]


def odds_score(stated: Array, happened: NDArray[np.bool_], classes: int = 5) -> OddsScore:
    """classes: (mean stated, share that happened, count) of each fifth of the range 0..1 that was used."""
    which = np.minimum((stated * classes).astype(int), classes - 1)
    rows = []
    for index in range(classes):
        among = which == index
        if among.any():
            rows.append((float(stated[among].mean()), float(happened[among].mean()), int(among.sum())))
    return OddsScore(float(((stated - happened) ** 2).mean()), tuple(rows))
