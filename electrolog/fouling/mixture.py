"""A unit's posterior, of all that may have happened to it: all went well, one thing went wrong, or a slip and one more.

The last is looked at only where a slip is likely, beside the likeliest one: two tenfold slips among seven readings
happen, and with one alone allowed the other would be taken for a bad day of every probe that was read on it.
"""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from electrolog.fouling.fates import SLIP_KINDS, Odds, likeliest_slip, nothing, odds_of, one_thing, one_thing_more
from electrolog.fouling.quadrature import (
    WELL,
    WRONG,
    Grid,
    Setup,
    Tilted,
    inverse_covariance,
    refit_grid,
    starting_grid,
    tilt,
)
from electrolog.fouling.shapes.shape import Shape

Floats = NDArray[np.float64]
Integers = NDArray[np.int64]
LIKELY = 0.1  # probability of a slip from which on a second thing is looked for
FEWEST = 3  # readings of a unit for that: two slips of two would leave nothing to tell by
Grids = tuple[Grid, Grid, Grid]  # all well, one thing wrong, a slip and one thing more


@dataclass(frozen=True)
class Part:
    """One of the three, for those units (b,) that it was looked at for, and its share of each one's posterior (b,)."""

    rows: Integers
    setup: Setup
    tilted: Tilted
    share: Floats

    @property
    def by_fate(self) -> Floats:
        """(b, O)."""
        return np.asarray(self.share[:, None] * np.einsum("bgo->bo", self.tilted.probability))


@dataclass(frozen=True)
class Mixture:
    setup: Setup
    odds: Odds
    parts: tuple[Part, ...]
    log_evidence: Floats  # (B,)
    slipped: Floats  # (B, n) probabilities
    damaged: Floats  # (B, n) that damage came before each reading


def starting_grids(setup: Setup) -> Grids:
    wrong = starting_grid(setup, WRONG)
    return starting_grid(setup, WELL), wrong, wrong


def settle_grids(shape: Shape, setup: Setup, rounds: int = 6) -> Grids:
    """From the prior onto the peaks."""
    grids = starting_grids(setup)
    for _ in range(rounds):
        grids = refit_grids(weigh(shape, setup, grids), grids)
    return grids


def weigh(shape: Shape, setup: Setup, grids: Grids) -> Mixture:
    real, q = setup.batch.real, setup.latent_variance.shape[1]
    n_units, n = real.shape
    odds = odds_of(real, setup.slip_odds, setup.damage_odds)
    inverse, fates = inverse_covariance(setup), one_thing(odds, real, q)
    well = tilt(shape, setup, grids[0], nothing(odds, q), inverse)
    wrong = tilt(shape, setup, grids[1], fates, inverse)
    by_fate = np.einsum("bgo->bo", wrong.probability)
    slip = by_fate[:, n:].sum(axis=1) * np.exp(wrong.log_evidence - np.logaddexp(well.log_evidence, wrong.log_evidence))
    suspects = np.flatnonzero((slip > LIKELY) & (real.sum(axis=1) >= FEWEST))
    everyone = np.arange(n_units)
    tilts = [(everyone, setup, well), (everyone, setup, wrong)]
    if len(suspects):
        reading, kind = likeliest_slip(by_fate[suspects], n)
        more = one_thing_more(fates.take(suspects), odds.slips[suspects], reading, kind)
        freed = free_of_slip(setup.take(suspects), reading, kind)
        tilted = tilt(shape, freed, grids[2].take(suspects), more, inverse_covariance(freed))
        tilts.append((suspects, freed, tilted))
    return mix(setup, odds, tilts)


def mix(setup: Setup, odds: Odds, tilts: list[tuple[Integers, Setup, Tilted]]) -> Mixture:
    log_evidence = np.full((len(tilts), len(setup.batch.real)), -np.inf)
    for log, (rows, _, tilted) in zip(log_evidence, tilts, strict=True):
        log[rows] = tilted.log_evidence
    total = np.logaddexp.reduce(log_evidence, axis=0)
    shares = np.exp(log_evidence - total)
    parts = tuple(
        Part(rows, own, tilted, share[rows]) for share, (rows, own, tilted) in zip(shares, tilts, strict=True)
    )
    slipped, damaged = np.zeros(setup.batch.real.shape), np.zeros(setup.batch.real.shape)
    for part in parts:
        by_fate = part.by_fate
        slipped[part.rows] += part.tilted.fates.slipped(by_fate, part.share)
        damaged[part.rows] += part.tilted.fates.damaged(by_fate)
    return Mixture(setup, odds, parts, total, slipped, damaged)


def free_of_slip(setup: Setup, reading: Integers, kind: Integers) -> Setup:
    """As if the slip were known: what it adds is taken off its reading, and its spread added to the error."""
    unit = np.arange(len(reading))
    y, variance = setup.batch.log_sensitivity.copy(), setup.batch.variance.copy()
    y[unit, reading] -= SLIP_KINDS[kind, 1]
    variance[unit, reading] += SLIP_KINDS[kind, 2] ** 2
    return replace(setup, batch=replace(setup.batch, log_sensitivity=y, variance=variance))


def refit_grids(mixture: Mixture, grids: Grids) -> Grids:
    """Each grid on its own peak; the third begins on the prior for whoever isn't looked at so closely yet."""
    well, wrong = (refit_grid(part.tilted, grid) for part, grid in zip(mixture.parts[:2], grids[:2], strict=True))
    third = starting_grid(mixture.setup, WRONG)
    for part in mixture.parts[2:]:
        moved = refit_grid(part.tilted, grids[2].take(part.rows))
        centre, spread = third.centre.copy(), third.spread.copy()
        centre[part.rows], spread[part.rows] = moved.centre, moved.spread
        third = Grid(centre, spread, WRONG)
    return well, wrong, third


def moments_of_latents(mixture: Mixture) -> tuple[Floats, Floats]:
    """Mean and variance (B, q) of each unit's latents."""
    shape = mixture.setup.latent_variance.shape
    mean, square = np.zeros(shape), np.zeros(shape)
    centre = mixture.setup.cavity_mean[:, : shape[1]]
    for part in mixture.parts:
        weight = part.share[:, None] * np.einsum("bgo->bg", part.tilted.probability)
        off = part.tilted.nodes - centre[part.rows][:, None, :]
        mean[part.rows] += np.einsum("bg,bgi->bi", weight, off)
        square[part.rows] += np.einsum("bg,bgi->bi", weight, off**2)
    return centre + mean, np.maximum(square - mean**2, 0.0)
