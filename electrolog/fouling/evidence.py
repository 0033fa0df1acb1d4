"""Slopes of a unit's log evidence: in the shared effects it sees, to second order, and in the hyper-parameters."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from electrolog.fouling.mixture import Mixture, Part
from electrolog.fouling.parameters import Layout
from electrolog.fouling.quadrature import Setup

Floats = NDArray[np.float64]


@dataclass(frozen=True)
class Slopes:
    gradient: Floats  # (B, R) of log evidence in the cavity's mean
    curvature: Floats  # (B, R, R) its negative second derivative there
    score: Floats  # (B, P) in theta, the cavity held


def slopes(layout: Layout, mixture: Mixture, clock_slopes: Floats) -> Slopes:
    """clock_slopes (B, n, S + M): slopes of the hours on the clock in log weights and logit recoveries."""
    setup = mixture.setup
    n_units, rows = setup.cavity_mean.shape
    gradient, excess = np.zeros((n_units, rows)), np.zeros((n_units, rows, rows))
    per_hour = np.zeros(setup.hours.shape)
    score = np.zeros((n_units, len(layout.priors)))
    for part in mixture.parts:
        by_node, first, second = pulls(part)
        pull = by_node[..., rows - setup.hours.shape[1] :]
        gradient[part.rows] += first
        excess[part.rows] += second
        per_hour[part.rows] += np.einsum("bgn,bgn->bn", pull, part.tilted.loss.per_hour)
        for k, slope in enumerate(part.tilted.loss.per_parameter):
            score[part.rows, layout.shape_slots.start + k] -= np.einsum("bgn,bgn->b", pull, slope)
    curvature = gradient[:, :, None] * gradient[:, None, :] - excess
    of_scales(score, layout, setup, excess)
    of_odds(score, mixture)
    of_clock(score, layout, -np.einsum("bn,bns->bs", per_hour, clock_slopes))
    return Slopes(gradient, curvature, score)


def pulls(part: Part) -> tuple[Floats, Floats, Floats]:
    """This part's share of: inverse(J) residual per node (b, G, R) and its sum (b, R), and of its second moments less
    the expected inverse(J) (b, R, R)."""
    tilted = part.tilted
    weight = tilted.probability * part.share[:, None, None]
    moved = weight * tilted.shift
    bent_back = moved @ tilted.bent.transpose(0, 2, 1)
    plain = np.einsum("bgo->bg", weight)[..., None] * tilted.pulled
    by_node = plain - bent_back
    cross = tilted.pulled.transpose(0, 2, 1) @ bent_back
    of_fates = np.einsum("bgo,bgo->bo", moved, tilted.shift) + part.by_fate / tilted.stiffness
    second = plain.transpose(0, 2, 1) @ tilted.pulled - cross - cross.transpose(0, 2, 1)
    second += (tilted.bent * of_fates[:, None, :]) @ tilted.bent.transpose(0, 2, 1)
    return by_node, by_node.sum(axis=1), second - part.share[:, None, None] * tilted.precision


def of_scales(score: Floats, layout: Layout, setup: Setup, excess: Floats) -> None:
    """excess (B, R, R) is twice the slope of log evidence in J."""
    real, q = setup.batch.real, setup.latent_variance.shape[1]
    own = np.diagonal(excess, axis1=1, axis2=2)
    score[:, 0] = setup.level_variance * np.einsum("bij,bi,bj->b", excess[:, q:, q:], real, real)
    score[:, 1] = setup.residual_variance * (own[:, q:] * real).sum(1)
    score[:, layout.latent_slots] = setup.latent_variance * own[:, :q]


def of_odds(score: Floats, mixture: Mixture) -> None:
    score[:, 5] = mixture.slipped.sum(1) - mixture.odds.slips_expected
    score[:, 6] = mixture.damaged.sum(1) - mixture.odds.damages_expected


def of_clock(score: Floats, layout: Layout, by_clock: Floats) -> None:
    free = [k for k, name in enumerate(layout.settings) if name in layout.free_settings]
    score[:, layout.weight_slots] = by_clock[:, free]
    score[:, layout.recovery_slots] = by_clock[:, len(layout.settings) :]
