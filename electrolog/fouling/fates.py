"""What may have happened to a unit beyond fouling and ordinary error: at most one thing.

Nothing; sudden damage that stays, before one reading but the first; or a slip at one reading: of the decimal point
either way, or of any other size (a unit, a wrong standard). Each adds a Gaussian shift along one vector u.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]
SLIP_SD = 2.0
DECIMAL = float(np.log(10.0))
SLIP_KINDS = np.array([(0.35, DECIMAL, 0.05), (0.35, -DECIMAL, 0.05), (0.3, 0.0, SLIP_SD)])  # share, mean, sd
DAMAGE_MEAN, DAMAGE_SD = -0.9, 0.6  # half of the sensitivity or more is gone at once


@dataclass(frozen=True)
class Fates:
    """The O = 1 + n + 3 n things that may have happened to each unit: none, damages, slips kind by kind."""

    along: Floats  # (B, q + n, O) vectors u
    log_prior: Floats  # (B, O)
    mean: Floats  # (O,)
    variance: Floats  # (O,)
    slip_expected: Floats  # (B,) prior probability of any slip
    damage_expected: Floats  # (B,)


def possible_fates(real: NDArray[np.bool_], slip_odds: Floats, damage_odds: Floats, q: int) -> Fates:
    """real, slip_odds (B, n); damage_odds (B,); q rows of latents before the readings' rows."""
    n_units, n = real.shape
    kinds, places = len(SLIP_KINDS), np.arange(n)
    share, mean, sd = SLIP_KINDS.T
    along = np.zeros((n_units, q + n, 1 + n + kinds * n))
    along[:, q:, 1 : 1 + n] = (places[:, None] >= places[None, :]) * real[:, :, None] * real[:, None, :]
    for kind in range(kinds):
        along[:, q + places, 1 + n + kind * n + places] = real
    slips, damages = slip_odds * real, damage_odds[:, None] * (real & (places > 0))
    total = 1.0 + slips.sum(1) + damages.sum(1)
    each_kind = (share[:, None] * slips[:, None, :]).reshape(n_units, -1)
    odds = np.concatenate([np.ones((n_units, 1)), damages, each_kind], axis=1) / total[:, None]
    with np.errstate(divide="ignore"):
        log_prior = np.log(odds)
    return Fates(
        along,
        log_prior,
        np.concatenate([[0.0], np.full(n, DAMAGE_MEAN), np.repeat(mean, n)]),
        np.concatenate([[1.0], np.full(n, DAMAGE_SD**2), np.repeat(sd**2, n)]),
        slips.sum(1) / total,
        damages.sum(1) / total,
    )


def slip_chances(by_fate: Floats, n: int) -> Floats:
    """(B, n) that each reading is a slip, from (B, O)."""
    return np.asarray(by_fate[:, 1 + n :].reshape(len(by_fate), -1, n).sum(axis=1))


def damage_chances(by_fate: Floats, n: int) -> Floats:
    """(B, n) that damage came before each reading."""
    return by_fate[:, 1 : 1 + n]
