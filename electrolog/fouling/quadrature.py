"""What one unit's readings say, given what all other units say of the shared effects (its cavity).

A unit's residual vector stacks its latents less their means and its readings less what is expected of them. Given the
latents it is Gaussian with one covariance J, so the level, the shared effects and every reading's error are integrated
exactly; the latents (log rate, log exponent) by the trapezoid rule on a grid laid on the unit's own posterior: for a
smooth density that converges faster than any power of the spacing (Trefethen & Weideman 2014, doi:10.1137/130932132).
Nodes are dense on the main peak and reach far beyond it (a sinh map), for a peak may stand on a broad foot.

At most one thing goes wrong with a unit: nothing; a slip at one reading; sudden damage that stays, before one reading
but the first. A slip or a damage adds a Gaussian shift along one vector u, so J changes by rank one.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from electrolog.fouling.batches import Batch
from electrolog.fouling.shapes.shape import Loss, Shape

Floats = NDArray[np.float64]
SLIP_SD = 2.0  # a slip of the decimal point moves log sensitivity by 2.3
DAMAGE_MEAN, DAMAGE_SD = -0.9, 0.6  # half of the sensitivity or more is gone at once
SPACING = {0: 1.0, 1: 0.6, 2: 0.9}  # of the nodes, in standard deviations, by the number of latents
REACH = 4.3  # of the grid before it is stretched, in standard deviations
STRETCH = 0.45


@dataclass(frozen=True)
class Grid:
    """A unit's nodes: centre (B, q) + spread (B, q, q) @ standard nodes."""

    centre: Floats
    spread: Floats


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
    slip_odds: Floats  # (B,)
    damage_odds: Floats  # (B,)
    shape_parameters: Floats  # (B, p)


@dataclass(frozen=True)
class Fates:
    """The O = 1 + n + n things that may have happened to each unit, in the order none, slips, damages."""

    along: Floats  # (B, q + n, O) vectors u
    log_prior: Floats  # (B, O)
    mean: Floats  # (O,)
    variance: Floats  # (O,)
    slip_expected: Floats  # (B,) prior probability of any slip
    damage_expected: Floats  # (B,)


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
    bent: Floats  # (B, R, O) inverse of J times u
    stiffness: Floats  # (B, O) u' inverse(J) u + 1 / variance


def standard_nodes(n_latents: int) -> tuple[Floats, Floats]:
    """(G, q) nodes in standard deviations, and the log volume (G,) of each one's cell."""
    if n_latents == 0:
        return np.zeros((1, 0)), np.zeros(1)
    half = int(REACH / SPACING[n_latents])
    line = np.arange(-half, half + 1) * SPACING[n_latents]
    even = np.stack(np.meshgrid(*[line] * n_latents, indexing="ij"), axis=-1).reshape(-1, n_latents)
    even = even[np.linalg.norm(even, axis=1) <= REACH]
    volume = np.log(np.cosh(STRETCH * even)).sum(axis=1) + n_latents * np.log(SPACING[n_latents])
    return stretched(even), volume


def stretched(even: Floats) -> Floats:
    return np.sinh(STRETCH * even) / STRETCH


def tilt(shape: Shape, setup: Setup, grid: Grid) -> Tilted:
    q = grid.centre.shape[1]
    steps, volume = standard_nodes(q)
    nodes = grid.centre[:, None, :] + np.einsum("bij,gj->bgi", grid.spread, steps)
    loss = shape.loss(setup.hours[:, None, :], nodes[:, :, None, :], setup.shape_parameters[:, None, None, :])
    residual = residuals(setup, nodes, loss)
    precision, log_det = invert(covariance(setup))
    pulled = residual @ precision
    fates = possible_fates(setup, q)
    bent = precision @ fates.along
    stiffness = np.einsum("bro,bro->bo", fates.along, bent) + 1.0 / fates.variance
    push = pulled @ fates.along + fates.mean / fates.variance
    shift = push / stiffness[:, None, :]
    gain = 0.5 * (push * shift - fates.mean**2 / fates.variance - np.log(fates.variance * stiffness)[:, None, :])
    gain[..., 0] = shift[..., 0] = 0.0
    base = -0.5 * ((pulled * residual).sum(-1) + log_det[:, None] + count_terms(setup) * np.log(2.0 * np.pi))
    cell = np.log(np.abs(np.linalg.det(grid.spread)))[:, None] + volume
    log_weight = base[..., None] + gain + fates.log_prior[:, None, :] + cell[:, :, None]
    top = log_weight.max(axis=(1, 2), keepdims=True)
    weight = np.exp(log_weight - top)
    total = weight.sum(axis=(1, 2), keepdims=True)
    log_evidence = (top + np.log(total))[:, 0, 0]
    return Tilted(log_evidence, weight / total, nodes, loss, precision, pulled, shift, fates, bent, stiffness)


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
    return setup.batch.real.sum(axis=1, keepdims=True) + setup.latent_variance.shape[1]


def possible_fates(setup: Setup, q: int) -> Fates:
    real = setup.batch.real
    n_units, n = real.shape
    along = np.zeros((n_units, q + n, 1 + 2 * n))
    places = np.arange(n)
    along[:, q + places, 1 + places] = real
    along[:, q:, 1 + n :] = (places[:, None] >= places[None, :]) * real[:, :, None] * real[:, None, :]
    can_break = real & (places > 0)
    slips, damages = setup.slip_odds[:, None] * real, setup.damage_odds[:, None] * can_break
    total = 1.0 + slips.sum(1) + damages.sum(1)
    odds = np.concatenate([np.ones((n_units, 1)), slips, damages], axis=1) / total[:, None]
    with np.errstate(divide="ignore"):
        log_prior = np.log(odds)
    mean = np.concatenate([[0.0], np.zeros(n), np.full(n, DAMAGE_MEAN)])
    variance = np.concatenate([[1.0], np.full(n, SLIP_SD**2), np.full(n, DAMAGE_SD**2)])
    return Fates(along, log_prior, mean, variance, slips.sum(1) / total, damages.sum(1) / total)


def starting_grid(setup: Setup, widening: float = 1.0) -> Grid:
    """A grid on the prior: the cavity's means, with the cavity's and the units' own variances."""
    q = setup.latent_variance.shape[1]
    variance = np.diagonal(setup.cavity_covariance, axis1=1, axis2=2)[:, :q] + setup.latent_variance
    return Grid(setup.cavity_mean[:, :q].copy(), np.sqrt(variance)[:, :, None] * np.eye(q) * widening)


def refit_grid(tilted: Tilted, grid: Grid) -> Grid:
    """The grid moved onto the main peak it found; never shrunk to less than about half at once, or it would be missed.

    The peak's mean and covariance are those of the squared density, the covariance doubled: right for a Gaussian, and
    hardly moved by a broad foot.
    """
    q = grid.centre.shape[1]
    if q == 0:
        return grid
    weight = tilted.probability.sum(axis=2)
    squared = weight**2 * np.exp(-standard_nodes(q)[1])
    mean, spread = moments(squared / squared.sum(axis=1, keepdims=True), tilted.nodes)
    floor = (0.5 * np.linalg.norm(grid.spread, axis=2) * SPACING[q]) ** 2
    own = np.diagonal(spread, axis1=1, axis2=2)
    spread[:, np.arange(q), np.arange(q)] += np.where(own < floor, floor, own)
    return Grid(mean, np.linalg.cholesky(spread + off_diagonal(spread)))


def off_diagonal(matrices: Floats) -> Floats:
    return matrices * (1.0 - np.eye(matrices.shape[1]))


def moments(weight: Floats, nodes: Floats) -> tuple[Floats, Floats]:
    """Mean (B, q) and covariance (B, q, q) of nodes (B, G, q) by weight (B, G)."""
    mean = np.einsum("bg,bgi->bi", weight, nodes)
    off = nodes - mean[:, None, :]
    return mean, (weight[..., None] * off).transpose(0, 2, 1) @ off
