"""What one unit's readings say, given what all other units say of the shared effects (its cavity).

A unit's residual vector stacks its latents less their means and its readings less what is expected of them. Given the
latents it is Gaussian with one covariance J, so the level, the shared effects and every reading's error are integrated
exactly; the latents (log rate, log exponent) by the trapezoid rule on a grid laid on the unit's own posterior: for a
smooth density that converges faster than any power of the spacing (Trefethen & Weideman 2014, doi:10.1137/130932132).
Nodes are dense on the main peak and reach far beyond it (a sinh map), for a peak may stand on a broad foot.

What else may have happened to a unit (fates.py) shifts its readings along one vector u, so J changes by rank one.
Nothing and something having gone wrong have grids of their own (mixture.py), for the second leaves the latents far
less certain.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cache

import numpy as np
from numpy.typing import NDArray

from electrolog.fouling.batches import Batch
from electrolog.fouling.fates import Fates
from electrolog.fouling.shapes.shape import Loss, Shape

Floats = NDArray[np.float64]
Integers = NDArray[np.int64]
WELL, WRONG = 0, 1
# Of the nodes before they are stretched, in standard deviations, by the number of latents: all went well, something
# went wrong.
SPACING = {0: (1.0, 1.0), 1: (0.8, 0.9), 2: (0.9, 1.1)}
REACH = 4.3
STRETCH = 0.45


@dataclass(frozen=True)
class Grid:
    """Units' nodes: centre (B, q) + spread (B, q, q) @ standard nodes, as dense as is fit for WELL or WRONG."""

    centre: Floats
    spread: Floats
    which: int

    def take(self, rows: Integers) -> Grid:
        return Grid(self.centre[rows], self.spread[rows], self.which)


@dataclass(frozen=True)
class Nodes:
    """Standard nodes (G, q), log volumes (G,) and sides (G, q) of their cells."""

    place: Floats
    log_volume: Floats
    sides: Floats


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

    def take(self, rows: Integers) -> Setup:
        return Setup(
            self.batch.take(rows),
            self.hours[rows],
            self.cavity_mean[rows],
            self.cavity_covariance[rows],
            self.level_variance[rows],
            self.residual_variance[rows],
            self.latent_variance[rows],
            self.slip_odds[rows],
            self.damage_odds[rows],
            self.shape_parameters[rows],
        )


@dataclass(frozen=True)
class Tilted:
    """The unit's posterior over nodes and fates, and what it is made of."""

    log_evidence: Floats  # (B,), -inf where no fate is possible
    probability: Floats  # (B, G, O)
    nodes: Floats  # (B, G, q)
    loss: Loss  # (B, G, n)
    precision: Floats  # (B, R, R) inverse of J
    pulled: Floats  # (B, G, R) inverse of J times the residuals
    shift: Floats  # (B, G, O) expected size of the slip or damage
    fates: Fates
    bent: Floats  # (B, R, O) inverse of J times u
    stiffness: Floats  # (B, O) u' inverse(J) u + 1 / variance


@cache
def standard_nodes(n_latents: int, which: int) -> Nodes:
    if n_latents == 0:
        return Nodes(np.zeros((1, 0)), np.zeros(1), np.zeros((1, 0)))
    spacing = SPACING[n_latents][which]
    even = even_nodes(n_latents, spacing)
    widening = np.cosh(STRETCH * even) * spacing
    return Nodes(np.sinh(STRETCH * even) / STRETCH, np.log(widening).sum(axis=1), widening)


def even_nodes(n_latents: int, spacing: float) -> Floats:
    half = int(REACH / spacing)
    line = np.arange(-half, half + 1) * spacing
    even = np.stack(np.meshgrid(*[line] * n_latents, indexing="ij"), axis=-1).reshape(-1, n_latents)
    return np.asarray(even[np.linalg.norm(even, axis=1) <= REACH])


def place_nodes(grid: Grid, nodes: Nodes) -> Floats:
    """(B, G, q)."""
    return np.asarray(grid.centre[:, None, :] + nodes.place @ grid.spread.transpose(0, 2, 1))


def tilt(shape: Shape, setup: Setup, grid: Grid, fates: Fates, inverse: tuple[Floats, Floats]) -> Tilted:
    """inverse: of the setup's J, with its log determinant; the same for all that may have happened."""
    standard = standard_nodes(grid.centre.shape[1], grid.which)
    nodes = place_nodes(grid, standard)
    loss = shape.loss(setup.hours[:, None, :], nodes[:, :, None, :], setup.shape_parameters[:, None, None, :])
    residual = residuals(setup, nodes, loss)
    precision, log_det = inverse
    pulled = residual @ precision
    bent = precision @ fates.along
    stiffness = np.einsum("bro,bro->bo", fates.along, bent) + 1.0 / fates.variance
    push = pulled @ fates.along
    push += fates.mean / fates.variance
    shift = push / stiffness[:, None, :]
    base = -0.5 * (
        np.einsum("bgr,bgr->bg", pulled, residual) + log_det[:, None] + count_terms(setup) * np.log(2.0 * np.pi)
    )
    base += np.log(np.abs(np.linalg.det(grid.spread)))[:, None] + standard.log_volume
    of_fate = fates.log_prior - 0.5 * (fates.mean**2 / fates.variance + np.log(fates.variance * stiffness))
    log_weight = np.multiply(push, shift, out=push)
    log_weight *= 0.5
    log_weight += base[..., None] + of_fate[:, None, :]
    log_evidence, probability = normalised(log_weight)
    return Tilted(log_evidence, probability, nodes, loss, precision, pulled, shift, fates, bent, stiffness)


def normalised(log_weight: Floats) -> tuple[Floats, Floats]:
    """Log of the sums (B,), and each one's share (B, G, O); changes its argument."""
    top = log_weight.max(axis=(1, 2))
    possible = np.isfinite(top)
    log_weight -= np.where(possible, top, 0.0)[:, None, None]
    weight = np.exp(log_weight, out=log_weight)
    total = weight.sum(axis=(1, 2))
    weight /= np.where(possible, total, 1.0)[:, None, None]
    with np.errstate(divide="ignore"):
        return top + np.log(np.where(possible, total, 1.0)), weight


def inverse_covariance(setup: Setup) -> tuple[Floats, Floats]:
    return invert(covariance(setup))


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


def starting_grid(setup: Setup, which: int) -> Grid:
    """Grids on the prior: the cavity's means, with the cavity's and the units' own variances."""
    q = setup.latent_variance.shape[1]
    variance = np.diagonal(setup.cavity_covariance, axis1=1, axis2=2)[:, :q] + setup.latent_variance
    return Grid(setup.cavity_mean[:, :q], np.sqrt(variance)[:, :, None] * np.eye(q), which)


def refit_grid(tilted: Tilted, grid: Grid) -> Grid:
    """The grid moved onto the main peak it found.

    Never shrunk to less than about half at once, or a peak would be missed. The peak's mean and covariance are those
    of the squared density, the covariance doubled: right for a Gaussian, and hardly moved by a broad foot.
    """
    q = grid.centre.shape[1]
    if q == 0:
        return grid
    standard = standard_nodes(q, grid.which)
    possible = np.isfinite(tilted.log_evidence)  # nothing can be wrong with a unit that has no reading: it stays
    density = np.einsum("bgo->bg", tilted.probability)
    density[~possible] = 1.0
    squared = density**2 * np.exp(-standard.log_volume)
    off, spread = moments(squared / squared.sum(axis=1, keepdims=True), standard.place)
    values, axes = np.linalg.eigh(2.0 * spread)
    floor = (0.5 * SPACING[q][grid.which]) ** 2
    values = np.where(values < floor, values + floor, values)
    moved = grid.spread @ (axes * np.sqrt(values)[:, None, :])
    mean = grid.centre + np.einsum("bij,bj->bi", grid.spread, off)
    return Grid(
        np.where(possible[:, None], mean, grid.centre),
        np.where(possible[:, None, None], moved, grid.spread),
        grid.which,
    )


def moments(weight: Floats, nodes: Floats) -> tuple[Floats, Floats]:
    """Mean (B, q) and covariance (B, q, q) of nodes (G, q) by weight (B, G)."""
    mean = weight @ nodes
    off = nodes - mean[:, None, :]
    return mean, (weight[..., None] * off).transpose(0, 2, 1) @ off
