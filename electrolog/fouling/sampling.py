"""Draws of one unit's latents, level and damage from its posterior on a grid."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from electrolog.fouling.points import normal_quantiles, points_at
from electrolog.fouling.quadrature import Grid, Setup, Tilted, standard_nodes

Floats = NDArray[np.float64]
Integers = NDArray[np.int64]


def sample(
    tilted: Tilted, grid: Grid, setup: Setup, level: tuple[Floats, Floats], first: Integers, per_theta: int
) -> tuple[Floats, Floats, Floats, Integers]:
    """S draws per pair: latents (B, S, q), level before damage (B, S), damage (B, S), and the reading it came before.

    first (B,): which of the even points each pair's own begin with.
    """
    n_pairs, n_nodes, n_fates = tilted.probability.shape
    q, n = tilted.nodes.shape[2], setup.batch.real.shape[1]
    points = points_at(first[:, None] + np.arange(per_theta), 3 + q)
    ranks = (np.arange(per_theta) + points[:, :, 0]) / per_theta
    steps = np.cumsum(tilted.probability.reshape(n_pairs, -1), axis=1)
    cell = np.minimum((ranks[:, :, None] * steps[:, -1:, None] > steps[:, None, :]).sum(axis=2), n_nodes * n_fates - 1)
    node, fate = cell // n_fates, cell % n_fates
    pair = np.arange(n_pairs)[:, None]
    standard = standard_nodes(q)
    within = standard.place[node] + (points[:, :, 3:] - 0.5) * standard.sides[node]
    which = standard.grid[node]
    latents = grid.centre[pair, which] + np.einsum("bsij,bsj->bsi", grid.spread[pair, which], within)
    z = normal_quantiles(points[:, :, 1:3])
    shift = tilted.shift[pair, node, fate] + z[:, :, 0] / np.sqrt(tilted.stiffness[pair, fate])
    shift = np.where(fate > 0, shift, 0.0)
    mean, with_rows = level
    seen = with_rows[:, :-1].copy()
    seen[:, q:] += setup.level_variance[:, None] * setup.batch.real
    gain = np.einsum("bij,bj->bi", tilted.precision, seen)
    left = with_rows[:, -1] + setup.level_variance - np.einsum("bi,bi->b", gain, seen)
    by_node = np.einsum("bi,bgi->bg", seen, tilted.pulled)[pair, node]
    by_fate = np.einsum("bi,bio->bo", seen, tilted.bent)[pair, fate]
    drawn = mean[:, None] + by_node - by_fate * shift + np.sqrt(np.maximum(left, 0.0))[:, None] * z[:, :, 1]
    is_damage = (fate > 0) & (fate <= n)
    return latents, drawn, np.where(is_damage, shift, 0.0), np.where(is_damage, fate - 1, 0)
