"""What may have happened to a unit beyond fouling and ordinary error: nothing, one thing, or a slip and one thing more.

Sudden damage that stays, before one reading but the first; or a slip at one reading: of the decimal point either way,
or of any other size (a unit, a wrong standard). Each adds a Gaussian shift along one vector u.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]
Integers = NDArray[np.int64]
SLIP_SD = 2.0
DECIMAL = float(np.log(10.0))
SLIP_KINDS = np.array([(0.35, DECIMAL, 0.05), (0.35, -DECIMAL, 0.05), (0.3, 0.0, SLIP_SD)])  # share, mean, sd
DAMAGE_MEAN, DAMAGE_SD = -0.9, 0.6  # half of the sensitivity or more is gone at once


@dataclass(frozen=True)
class Odds:
    """Prior odds, against nothing at all, of a slip at each reading and of damage before it: (B, n) both, 0 where
    there is none."""

    slips: Floats
    damages: Floats

    @property
    def total(self) -> Floats:
        """(B,) of nothing, any one thing, and any slip with one thing more."""
        return 1.0 + self._slips + self._damages + self._two_slips + self._slips * self._damages

    @property
    def slips_expected(self) -> Floats:
        """(B,)."""
        return (self._slips * (1.0 + self._damages) + 2.0 * self._two_slips) / self.total

    @property
    def damages_expected(self) -> Floats:
        """(B,)."""
        return self._damages * (1.0 + self._slips) / self.total

    @property
    def _slips(self) -> Floats:
        return np.asarray(self.slips.sum(axis=1))

    @property
    def _damages(self) -> Floats:
        return np.asarray(self.damages.sum(axis=1))

    @property
    def _two_slips(self) -> Floats:
        return np.asarray(0.5 * (self._slips**2 - (self.slips**2).sum(axis=1)))


@dataclass(frozen=True)
class Fates:
    """O things that may have happened to each unit, besides the slips that it is `freed` of."""

    along: Floats  # (B, q + n, O) vectors u
    log_prior: Floats  # (B, O)
    mean: Floats  # (O,)
    variance: Floats  # (O,)
    freed: Floats  # (B, n) 1 where the reading is known to have slipped

    def take(self, rows: Integers) -> Fates:
        return Fates(self.along[rows], self.log_prior[rows], self.mean, self.variance, self.freed[rows])

    def damaged(self, by_fate: Floats) -> Floats:
        """(B, n) that damage came before each reading, from the fates' probabilities (B, O)."""
        n = self.freed.shape[1]
        return by_fate[:, :n] if len(self.mean) > 1 else np.zeros_like(self.freed)

    def slipped(self, by_fate: Floats, share: Floats) -> Floats:
        """(B, n) that each reading is a slip, from (B, O) and their sums (B,)."""
        n = self.freed.shape[1]
        known = self.freed * share[:, None]
        if len(self.mean) == 1:
            return known
        return np.asarray(known + by_fate[:, n:].reshape(len(by_fate), -1, n).sum(axis=1))


def odds_of(real: NDArray[np.bool_], slip_odds: Floats, damage_odds: Floats) -> Odds:
    """real, slip_odds (B, n); damage_odds (B,)."""
    return Odds(slip_odds * real, damage_odds[:, None] * (real & (np.arange(real.shape[1]) > 0)))


def nothing(odds: Odds, q: int) -> Fates:
    """One fate: all went well. q rows of latents stand before the readings' rows."""
    n_units, n = odds.slips.shape
    one = np.zeros((n_units, q + n, 1))
    return Fates(one, -np.log(odds.total)[:, None], np.zeros(1), np.ones(1), np.zeros((n_units, n)))


def one_thing(odds: Odds, real: NDArray[np.bool_], q: int) -> Fates:
    """Damage before each reading, then slips kind by kind: O = n + 3 n."""
    n_units, n = odds.slips.shape
    kinds, places = len(SLIP_KINDS), np.arange(n)
    share, mean, sd = SLIP_KINDS.T
    along = np.zeros((n_units, q + n, n + kinds * n))
    along[:, q:, :n] = (places[:, None] >= places[None, :]) * real[:, :, None] * real[:, None, :]
    for kind in range(kinds):
        along[:, q + places, n + kind * n + places] = real
    each_kind = (share[:, None] * odds.slips[:, None, :]).reshape(n_units, -1)
    with np.errstate(divide="ignore"):
        log_prior = np.log(np.concatenate([odds.damages, each_kind], axis=1) / odds.total[:, None])
    return Fates(
        along,
        log_prior,
        np.concatenate([np.full(n, DAMAGE_MEAN), np.repeat(mean, n)]),
        np.concatenate([np.full(n, DAMAGE_SD**2), np.repeat(sd**2, n)]),
        np.zeros((n_units, n)),
    )


def one_thing_more(fates: Fates, slip_odds: Floats, reading: Integers, kind: Integers) -> Fates:
    """The same beside a slip of a known kind (B,) at a known reading (B,), which cannot slip again."""
    n_units, n = slip_odds.shape
    unit = np.arange(n_units)
    with np.errstate(divide="ignore"):
        log_prior = fates.log_prior + np.log(SLIP_KINDS[kind, 0] * slip_odds[unit, reading])[:, None]
    for again in range(len(SLIP_KINDS)):
        log_prior[unit, n + again * n + reading] = -np.inf
    freed = np.zeros((n_units, n))
    freed[unit, reading] = 1.0
    return Fates(fates.along, log_prior, fates.mean, fates.variance, freed)


def likeliest_slip(by_fate: Floats, n: int) -> tuple[Integers, Integers]:
    """Reading and kind (B,), from the probabilities of one thing (B, O)."""
    best = by_fate[:, n:].argmax(axis=1)
    return best % n, best // n
