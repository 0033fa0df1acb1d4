"""Draws of one unit's latents, level and damage from its posterior on grids."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from electrolog.fouling.mixture import Grids, Mixture, Part
from electrolog.fouling.points import normal_quantiles, points_at
from electrolog.fouling.quadrature import Grid, standard_nodes

Floats = NDArray[np.float64]
Integers = NDArray[np.int64]


@dataclass(frozen=True)
class Drawn:
    """S draws of each of B pairs of unit and hyper-parameters."""

    latents: Floats  # (B, S, q)
    level: Floats  # (B, S) before damage
    damage: Floats  # (B, S)
    damaged_from: Integers  # (B, S) the reading that the damage came before


def sample(mixture: Mixture, grids: Grids, level: tuple[Floats, Floats], first: Integers, per_theta: int) -> Drawn:
    """level: mean (B,) of each one's expected level, and its covariance with every row and itself (B, R + 1).
    first (B,): which of the even points each pair's own begin with."""
    n_pairs, q = mixture.setup.latent_variance.shape
    points = points_at(first[:, None] + np.arange(per_theta), 3 + q)
    ranks = (np.arange(per_theta) + points[:, :, 0]) / per_theta
    steps, starts = cells_of(mixture)
    cell = (ranks[:, :, None] * steps[:, -1:, None] > steps[:, None, :]).sum(axis=2)
    cell = np.minimum(cell, steps.shape[1] - 1)
    shape = (n_pairs, per_theta)
    drawn = Drawn(np.zeros((*shape, q)), np.zeros(shape), np.zeros(shape), np.zeros(shape, dtype=np.int64))
    for part, grid, start, stop in zip(mixture.parts, grids, starts, starts[1:], strict=False):
        pair, draw = np.nonzero((cell >= start) & (cell < stop))
        draw_from(part, grid, level, (pair, draw), cell[pair, draw] - start, points[pair, draw], drawn)
    return drawn


def cells_of(mixture: Mixture) -> tuple[Floats, list[int]]:
    """Probabilities added up over all cells, part by part (B, C); where each part begins, and where the last ends."""
    starts, flat = [0], []
    for part in mixture.parts:
        shares = np.zeros((len(mixture.log_evidence), part.tilted.probability[0].size))
        shares[part.rows] = (part.tilted.probability * part.share[:, None, None]).reshape(len(part.rows), -1)
        flat.append(shares)
        starts.append(starts[-1] + shares.shape[1])
    return np.cumsum(np.concatenate(flat, axis=1), axis=1), starts


def draw_from(
    part: Part,
    grid: Grid,
    level: tuple[Floats, Floats],
    at: tuple[Integers, Integers],
    cell: Integers,
    points: Floats,
    drawn: Drawn,
) -> None:
    """Fill in the draws `at` (pair, draw) that fell into the cells of this part."""
    tilted, setup, pair = part.tilted, part.setup, at[0]
    row = np.searchsorted(part.rows, pair)
    n_fates, q, n = len(tilted.fates.mean), grid.centre.shape[1], setup.batch.real.shape[1]
    node, fate = cell // n_fates, cell % n_fates
    standard = standard_nodes(q, grid.which)
    within = standard.place[node] + (points[:, 3:] - 0.5) * standard.sides[node]
    drawn.latents[at] = grid.centre[pair] + np.einsum("dij,dj->di", grid.spread[pair], within)
    z = normal_quantiles(points[:, 1:3])
    shift = tilted.shift[row, node, fate] + z[:, 0] / np.sqrt(tilted.stiffness[row, fate])
    mean, with_rows = level
    seen = with_rows[part.rows, :-1].copy()
    seen[:, q:] += setup.level_variance[:, None] * setup.batch.real
    gain = np.einsum("bij,bi->bj", tilted.precision, seen)
    left = with_rows[part.rows, -1] + setup.level_variance - np.einsum("bi,bi->b", gain, seen)
    by_node = np.einsum("bi,bgi->bg", seen, tilted.pulled)[row, node]
    by_fate = np.einsum("bi,bio->bo", seen, tilted.bent)[row, fate]
    drawn.level[at] = mean[pair] + by_node - by_fate * shift + np.sqrt(np.maximum(left, 0.0))[row] * z[:, 1]
    is_damage = (n_fates > 1) & (fate < n)
    drawn.damage[at] = np.where(is_damage, shift, 0.0)
    drawn.damaged_from[at] = np.where(is_damage, fate, 0)
