"""The prior of a day's effect: most days are good ones, N(0, day_sd^2); a few are bad, N(0, bad_day_sd^2).

It is no Gaussian, so each day keeps a Gaussian stand-in with the moments that the mixture has beside all readings
of the
day (expectation propagation, Minka 2001).
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from electrolog.fouling.parameters import Scales

Floats = NDArray[np.float64]


@dataclass(frozen=True)
class DayPrior:
    """Per day: log evidence, its slopes in the cavity's mean, the odds of a bad day, and scores in theta[2:5]."""

    log_evidence: Floats
    gradient: Floats
    curvature: Floats
    bad: Floats
    score: Floats  # (days, 3)


def day_prior(scales: Scales, mean: Floats, variance: Floats, lonely: NDArray[np.bool_]) -> DayPrior:
    """mean, variance (days,): of each day's effect by its readings alone.

    A lonely day saw one unit. There a bad day and a slip would explain the same reading, and two stand-ins that can
    both give way never settle: its prior is the good days' alone, and what is far off is the unit's own slip.
    """
    spread = np.stack(np.broadcast_arrays(scales.day_sd**2, scales.bad_day_sd**2))[:, None]
    total = spread + variance
    odds = scales.bad_day_odds
    log_share = np.stack([-np.log1p(odds), np.log(odds) - np.log1p(odds)])[:, None]
    log_share = np.where(lonely, [[0.0], [-np.inf]], log_share)
    log_each = log_share - 0.5 * (np.log(2.0 * np.pi * total) + mean**2 / total)
    top = log_each.max(axis=0)
    weight = np.exp(log_each - top)
    log_evidence = top + np.log(weight.sum(axis=0))
    weight /= weight.sum(axis=0)
    pull = -mean / total
    gradient = (weight * pull).sum(axis=0)
    curvature = (weight * (1.0 / total - pull**2)).sum(axis=0) + gradient**2
    by_variance = weight * spread * (pull**2 - 1.0 / total)
    return DayPrior(
        log_evidence,
        gradient,
        curvature,
        weight[1],
        np.stack([by_variance[0], by_variance[1], np.where(lonely, 0.0, weight[1] - odds / (1.0 + odds))], axis=-1),
    )
