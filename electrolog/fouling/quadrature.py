"""What one unit's readings say, given what all other units say of the shared effects (its cavity).

A unit's residual vector stacks its latents less their means and its readings less what is expected of them. Given the
latents it is Gaussian with one covariance J, so the level, the shared effects and every reading's error are integrated
exactly; the latents (log rate, log exponent) by the trapezoid rule on a grid laid on the unit's own posterior: for a
smooth density that converges faster than any power of the spacing (Trefethen & Weideman 2014, doi:10.1137/130932132).
Nodes are dense on the main peak and reach far beyond it (a sinh map), for a peak may stand on a broad foot. There are
two grids: one for nothing having gone wrong, one for something having, for the second leaves the latents far less
certain.

What else may have happened to a unit (fates.py) shifts its readings along one vector u, so J changes by rank one.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cache

import numpy as np
from numpy.typing import NDArray

from electrolog.fouling.batches import Batch
from electrolog.fouling.fates import Fates, possible_fates
from electrolog.fouling.shapes.shape import Loss, Shape

Floats = NDArray[np.float64]
# Of the nodes before they are stretched, in standard deviations, by the number of latents: nothing wrong,
# something wrong.
SPACING = {0: (1.0, 1.0), 1: (0.8, 0.9), 2: (0.9, 1.1)}
REACH = 4.3
STRETCH = 0.45


@dataclass(frozen=True)
class Grid:
    """A unit's nodes: centre (B, 2, q) + spread (B, 2, q, q) @ standard nodes, for nothing wrong and for something
    wrong."""

    centre: Floats
    spread: Floats


@dataclass(frozen=True)
class Nodes:
    """Standard nodes (G, q) of both grids, log volumes (G,) and sides (G, q) of their cells, and each one's grid
    (G,)."""

    place: Floats
    log_volume: Floats
    sides: Floats
    grid: NDArray[np.int64]


@dataclass(frozen=True)
class Setup:
    """Everything about B units but their grids: cavity of the shared effects, scales per unit, hours on the clock."""

    batch: Batch
    hours: Floats  # (B, n)
    cavity_mean: Floats  # (B, q + n)
    cavity_covariance: Floats  # (B, q + n, q + n)
    level_variance: Floats  # (B,)
    residual_variance: Floats  # (B,)
    latent_variance: Floats  # (B, q)
    slip_odds: Floats  # (B, n) of each reading
    damage_odds: Floats  # (B,)
    shape_parameters: Floats  # (B, p)


@dataclass(frozen=True)
class Tilted:
    """The unit's posterior over nodes and fates, and what it is made of."""

    log_evidence: Floats  # (B,)
    probability: Floats  # (B, G, O)
    nodes: Floats  # (B, G, q)
    loss: Loss  # (B, G, n)
    precision: Floats  # (B, R, R) inverse of J
    pulled: Floats  # (B, G, R) inverse of J times the residuals
    shift: Floats  # (B, G, O) expected size of the slip or damage
    fates: Fates
    log_weight: Floats  # (B, G, O)
    bent: Floats  # (B, R, O) inverse of J times u
    stiffness: Floats  # (B, O) u' inverse(J) u + 1 / variance


@cache
def standard_nodes(n_latents: int) -> Nodes:
    if n_latents == 0:
        return Nodes(np.zeros((2, 0)), np.zeros(2), np.zeros((2, 0)), np.arange(2))
    both = [even_nodes(n_latents, spacing) for spacing in SPACING[n_latents]]
    which = np.repeat([0, 1], [len(even) for even in both])
    even = np.concatenate(both)
    widening = np.cosh(STRETCH * even) * np.array(SPACING[n_latents])[which][:, None]
    return Nodes(np.sinh(STRETCH * even) / STRETCH, np.log(widening).sum(axis=1), widening, which)


def even_nodes(n_latents: int, spacing: float) -> Floats:
    half = int(REACH / spacing)
    line = np.arange(-half, half + 1) * spacing
    even = np.stack(np.meshgrid(*[line] * n_latents, indexing="ij"), axis=-1).reshape(-1, n_latents)
    return np.asarray(even[np.linalg.norm(even, axis=1) <= REACH])


def place_nodes(grid: Grid, nodes: Nodes) -> Floats:
    """(B, G, q)."""
    moved = np.einsum("bgij,gj->bgi", grid.spread[:, nodes.grid], nodes.place)
    return np.asarray(grid.centre[:, nodes.grid] + moved)


def tilt(shape: Shape, setup: Setup, grid: Grid) -> Tilted:
    q = grid.centre.shape[2]
    standard = standard_nodes(q)
    nodes = place_nodes(grid, standard)
    loss = shape.loss(setup.hours[:, None, :], nodes[:, :, None, :], setup.shape_parameters[:, None, None, :])
    residual = residuals(setup, nodes, loss)
    precision, log_det = invert(covariance(setup))
    pulled = residual @ precision
    fates = possible_fates(setup.batch.real, setup.slip_odds, setup.damage_odds, q)
    bent = precision @ fates.along
    stiffness = np.einsum("bro,bro->bo", fates.along, bent) + 1.0 / fates.variance
    push = pulled @ fates.along + fates.mean / fates.variance
    shift = push / stiffness[:, None, :]
    gain = 0.5 * (push * shift - fates.mean**2 / fates.variance - np.log(fates.variance * stiffness)[:, None, :])
    gain[..., 0] = shift[..., 0] = 0.0
    base = -0.5 * (
        np.einsum("bgr,bgr->bg", pulled, residual) + log_det[:, None] + count_terms(setup) * np.log(2.0 * np.pi)
    )
    cell = np.log(np.abs(np.linalg.det(grid.spread)))[:, standard.grid] + standard.log_volume
    log_weight = (base + cell)[..., None] + gain + fates.log_prior[:, None, :]
    log_weight[:, standard.grid == 0, 1:] = -np.inf
    log_weight[:, standard.grid == 1, 0] = -np.inf
    top = log_weight.reshape(len(nodes), -1).max(axis=1)
    weight = np.exp(log_weight - top[:, None, None])
    total = weight.reshape(len(nodes), -1).sum(axis=1)
    log_evidence = top + np.log(total)
    return Tilted(
        log_evidence,
        weight / total[:, None, None],
        nodes,
        loss,
        precision,
        pulled,
        shift,
        fates,
        log_weight,
        bent,
        stiffness,
    )


def residuals(setup: Setup, nodes: Floats, loss: Loss) -> Floats:
    q = nodes.shape[2]
    read = setup.batch.log_sensitivity[:, None, :] + loss.value - setup.cavity_mean[:, None, q:]
    return np.concatenate([nodes - setup.cavity_mean[:, None, :q], read * setup.batch.real[:, None, :]], axis=2)


def covariance(setup: Setup) -> Floats:
    """J: the cavity's, the units' own spread of latents and level, the readings' errors; ones where padded."""
    q = setup.latent_variance.shape[1]
    real = setup.batch.real
    own = setup.cavity_covariance.copy()
    own[:, q:, q:] += setup.level_variance[:, None, None] * (real[:, :, None] & real[:, None, :])
    noise = np.where(real, setup.residual_variance[:, None] + setup.batch.variance, 1.0)
    diagonal = np.arange(own.shape[1])
    own[:, diagonal, diagonal] += np.concatenate([setup.latent_variance, noise], axis=1)
    return own


def invert(matrices: Floats) -> tuple[Floats, Floats]:
    """Inverse and log determinant of many small positive definite matrices."""
    if matrices.shape[1] == 0:
        return matrices, np.zeros(len(matrices))
    factor = np.linalg.cholesky(matrices)
    log_det = 2.0 * np.log(np.diagonal(factor, axis1=1, axis2=2)).sum(-1)
    inverse = np.linalg.inv(matrices)
    return 0.5 * (inverse + inverse.transpose(0, 2, 1)), log_det


def count_terms(setup: Setup) -> Floats:
    return np.asarray(setup.batch.real.sum(axis=1, keepdims=True) + setup.latent_variance.shape[1], dtype=np.float64)


def starting_grid(setup: Setup) -> Grid:
    """Grids on the prior: the cavity's means, with the cavity's and the units' own variances."""
    q = setup.latent_variance.shape[1]
    variance = np.diagonal(setup.cavity_covariance, axis1=1, axis2=2)[:, :q] + setup.latent_variance
    one = np.sqrt(variance)[:, :, None] * np.eye(q)
    return Grid(np.stack([setup.cavity_mean[:, :q]] * 2, axis=1), np.stack([one] * 2, axis=1))


def refit_grid(tilted: Tilted, grid: Grid) -> Grid:
    """The grids moved onto the main peaks they found."""
    q = grid.centre.shape[2]
    if q == 0:
        return grid
    parts = [refit_one(tilted, grid, which) for which in (0, 1)]
    return Grid(np.stack([p[0] for p in parts], axis=1), np.stack([p[1] for p in parts], axis=1))


def refit_one(tilted: Tilted, grid: Grid, which: int) -> tuple[Floats, Floats]:
    """Never shrunk to less than about half at once, or a peak would be missed.

    The peak's mean and covariance are those of the squared density, the covariance doubled: right for a Gaussian, and
    hardly moved by a broad foot.
    """
    q = grid.centre.shape[2]
    standard = standard_nodes(q)
    mine = standard.grid == which
    by_node = tilted.log_weight[:, mine][:, :, [0] if which == 0 else slice(1, None)]
    top = by_node.reshape(len(by_node), -1).max(axis=1)
    possible = np.isfinite(top)  # nothing can be wrong with a unit that has no reading: that grid stays where it is
    density = np.einsum("bgo->bg", np.exp(by_node - np.where(possible, top, 0.0)[:, None, None]))
    density[~possible] = 1.0
    squared = density**2 * np.exp(-standard.log_volume[mine])
    off, spread = moments(squared / squared.sum(axis=1, keepdims=True), standard.place[mine])
    values, axes = np.linalg.eigh(2.0 * spread)
    floor = (0.5 * SPACING[q][which]) ** 2
    values = np.where(values < floor, values + floor, values)
    before = grid.spread[:, which]
    moved = before @ (axes * np.sqrt(values)[:, None, :])
    mean = grid.centre[:, which] + np.einsum("bij,bj->bi", before, off)
    mean = np.where(possible[:, None], mean, grid.centre[:, which])
    return mean, np.where(possible[:, None, None], moved, before)


def moments(weight: Floats, nodes: Floats) -> tuple[Floats, Floats]:
    """Mean (B, q) and covariance (B, q, q) of nodes (G, q) by weight (B, G)."""
    mean = weight @ nodes
    off = nodes - mean[:, None, :]
    return mean, (weight[..., None] * off).transpose(0, 2, 1) @ off
