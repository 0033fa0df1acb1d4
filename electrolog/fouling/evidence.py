"""Slopes of a unit's log evidence: in the shared effects it sees, to second order, and in the hyper-parameters."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from electrolog.fouling.fates import damage_chances, slip_chances
from electrolog.fouling.parameters import Layout
from electrolog.fouling.quadrature import Setup, Tilted

Floats = NDArray[np.float64]


@dataclass(frozen=True)
class Slopes:
    gradient: Floats  # (B, R) of log evidence in the cavity's mean
    curvature: Floats  # (B, R, R) its negative second derivative there
    score: Floats  # (B, P) in theta, the cavity held


def slopes(layout: Layout, setup: Setup, tilted: Tilted, clock_slopes: Floats) -> Slopes:
    """clock_slopes (B, n, S + M): slopes of the hours on the clock in log weights and logit recoveries."""
    by_node, gradient, second, expected = pulls(tilted)
    curvature = expected - second + gradient[:, :, None] * gradient[:, None, :]
    score = scores(layout, setup, tilted, by_node, second - expected, clock_slopes)
    return Slopes(gradient, curvature, score)


def pulls(tilted: Tilted) -> tuple[Floats, Floats, Floats, Floats]:
    """First and second moments of inverse(J) residual over the posterior, and the expected inverse(J)."""
    weight = tilted.probability
    moved = weight * tilted.shift
    bent_back = moved @ tilted.bent.transpose(0, 2, 1)
    plain = np.einsum("bgo->bg", weight)[..., None] * tilted.pulled
    by_node = plain - bent_back
    gradient = np.einsum("bgr->br", by_node)
    cross = tilted.pulled.transpose(0, 2, 1) @ bent_back
    second = plain.transpose(0, 2, 1) @ tilted.pulled
    second += (tilted.bent * np.einsum("bgo,bgo->bo", moved, tilted.shift)[:, None, :]) @ tilted.bent.transpose(0, 2, 1)
    second -= cross + cross.transpose(0, 2, 1)
    by_fate = np.einsum("bgo->bo", weight)
    by_fate = np.where(np.arange(by_fate.shape[1]) == 0, 0.0, by_fate / tilted.stiffness)
    expected = tilted.precision - (tilted.bent * by_fate[:, None, :]) @ tilted.bent.transpose(0, 2, 1)
    return by_node, gradient, second, expected


def scores(
    layout: Layout, setup: Setup, tilted: Tilted, by_node: Floats, excess: Floats, clock_slopes: Floats
) -> Floats:
    """excess (B, R, R) is twice the slope of log evidence in J."""
    q = tilted.nodes.shape[2]
    n = setup.batch.real.shape[1]
    real = setup.batch.real
    read = excess[:, q:, q:]
    own = np.diagonal(excess, axis1=1, axis2=2)
    score = np.zeros((len(real), len(layout.priors)))
    score[:, 0] = setup.level_variance * np.einsum("bij,bi,bj->b", read, real, real)
    score[:, 1] = setup.residual_variance * (own[:, q:] * real).sum(1)
    by_fate = np.einsum("bgo->bo", tilted.probability)
    score[:, 5] = slip_chances(by_fate, n).sum(1) - tilted.fates.slip_expected
    score[:, 6] = damage_chances(by_fate, n).sum(1) - tilted.fates.damage_expected
    score[:, layout.latent_slots] = setup.latent_variance * own[:, :q]
    pull = by_node[..., q:]
    per_hour = np.einsum("bgn,bgn->bn", pull, tilted.loss.per_hour)
    by_clock = -np.einsum("bn,bns->bs", per_hour, clock_slopes)
    free = [k for k, name in enumerate(layout.settings) if name in layout.free_settings]
    score[:, layout.weight_slots] = by_clock[:, free]
    score[:, layout.recovery_slots] = by_clock[:, len(layout.settings) :]
    for k, slope in enumerate(tilted.loss.per_parameter):
        score[:, layout.shape_slots.start + k] = -np.einsum("bgn,bgn->b", pull, slope)
    return score
