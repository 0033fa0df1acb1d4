"""What all units together say of the shared effects, each unit seeing them without its own contribution.

Expectation propagation (Minka 2001): every unit, and every day's prior, is replaced by a Gaussian in the few shared
effects that it sees; a factor is judged beside all the others' Gaussians (its cavity), so a day's uncertainty is shared
by every probe measured on it, and no probe's own reading is counted twice. At the fixed point the log evidence is
stationary in the stand-ins, so its slope in theta is the sum of the factors' own (Seeger 2005).
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from electrolog.fouling.batches import Batch
from electrolog.fouling.clock import Clock, run_clock
from electrolog.fouling.covariance import Covariance, Thin, between, variances
from electrolog.fouling.days import day_prior
from electrolog.fouling.effects import Effects
from electrolog.fouling.events import Events
from electrolog.fouling.evidence import slopes
from electrolog.fouling.mixture import Grids, Mixture, moments_of_latents, refit_grids, settle_grids, weigh
from electrolog.fouling.parameters import Layout, Scales, read_scales
from electrolog.fouling.quadrature import Setup
from electrolog.fouling.shared import Assembly, assemble, solve

Floats = NDArray[np.float64]


@dataclass
class Site:
    """Gaussian stand-ins: precision (B, R, R) and shift (B, R), natural parameters in the effects as rows see them."""

    precision: Floats
    shift: Floats


@dataclass
class State:
    """Where the propagation stands: stand-ins of units and days, grids, and the shared effects' mean and covariance.

    The covariance has one more row and column, of zeros, for "no column".
    """

    sites: list[Site]
    day_site: Site
    grids: list[Grids] | None
    mean: Floats
    covariance: Covariance
    grids_stay: bool = False


@dataclass(frozen=True)
class UnitsSeen:
    """What a sweep found of one batch's units: the whole mixture for every unit would fill the memory."""

    log_evidence: Floats  # (B,)
    slipped: Floats  # (B, n) probabilities
    damaged: Floats  # (B, n) that damage came before each reading
    latent_mean: Floats  # (B, q)
    latent_variance: Floats  # (B, q)


@dataclass(frozen=True)
class Outcome:
    log_evidence: float
    score: Floats  # (P,)
    unit_scores: Floats  # (units, P)
    bad_day: Floats
    day_information: Floats  # (3, 3) outer product of the days' scores in theta[2:5]
    group_information: Floats  # (g,) in the log sds of groups
    units: list[UnitsSeen]

    @property
    def mishaps(self) -> dict[int, float]:
        """Expected numbers of bad days, slips and damages, by the place of their odds in theta."""
        slips = sum(float(seen.slipped.sum()) for seen in self.units)
        damages = sum(float(seen.damaged.sum()) for seen in self.units)
        return {4: float(self.bad_day.sum()), 5: slips, 6: damages}


@dataclass(frozen=True)
class Problem:
    events: Events
    layout: Layout
    effects: Effects
    batches: list[Batch]
    assembly: Assembly


def start(problem: Problem, theta: Floats) -> State:
    rows = [batch.columns.shape[:2] for batch in problem.batches]
    sites = [Site(np.zeros((b, r, r)), np.zeros((b, r))) for b, r in rows]
    n_days = int(problem.effects.is_day.sum())
    precision = np.full(n_days, 1.0 / float(read_scales(problem.layout, theta).day_sd) ** 2)
    mean = np.zeros(len(problem.effects.names) + 1)
    # The covariance comes with the first combination: beforehand as a whole matrix, it would not fit into memory.
    return State(sites, Site(precision, np.zeros(n_days)), None, mean, np.zeros((0, 0)))


def settle(problem: Problem, theta: Floats, state: State, sweeps: int = 8, tolerance: float = 0.01) -> Outcome:
    """Sweep until the log evidence stands still; changes `state`."""
    before = -np.inf
    scales = read_scales(problem.layout, theta)
    clock = run_clock(problem.events, scales.weight, scales.recovery)
    for _ in range(sweeps):
        outcome = sweep(problem, scales, clock, state)
        if abs(outcome.log_evidence - before) < tolerance:
            break
        before = outcome.log_evidence
    return outcome


def sweep(problem: Problem, scales: Scales, clock: Clock, state: State) -> Outcome:
    """Judge every factor beside the others at once, then renew all stand-ins."""
    log_evidence = combine(problem, scales, state)
    score = np.zeros(len(problem.layout.priors))
    all_scores, all_seen, grids = [], [], []
    for k, (batch, site) in enumerate(zip(problem.batches, state.sites, strict=True)):
        cavity_mean, cavity = cavity_of(batch.columns, site, state)
        setup = set_up(batch, scales, clock, cavity_mean, cavity)
        grid = state.grids[k] if state.grids else settle_grids(problem.layout.shape, setup)
        mixture = weigh(problem.layout.shape, setup, grid)
        found = slopes(problem.layout, mixture, clock.reading_slopes[batch.reading])
        log_evidence += float(np.sum(mixture.log_evidence - log_overlap(site, cavity_mean, cavity)))
        state.sites[k] = renewed(found.gradient, found.curvature, cavity_mean, cavity)
        grids.append(grid if state.grids_stay else refit_grids(mixture, grid))
        all_scores.append(found.score)
        all_seen.append(units_seen(mixture))
    state.grids = grids
    by_days, day_scores, bad = sweep_days(problem.effects, scales, state)
    unit_scores = np.concatenate(all_scores) if all_scores else np.zeros((0, len(score)))
    score += unit_scores.sum(axis=0)
    score[problem.layout.group_slots], of_groups = group_scores(problem, scales, state)
    score[2:5] += day_scores.sum(axis=0)
    return Outcome(log_evidence + by_days, score, unit_scores, bad, day_scores.T @ day_scores, of_groups, all_seen)


def units_seen(mixture: Mixture) -> UnitsSeen:
    return UnitsSeen(mixture.log_evidence, mixture.slipped, mixture.damaged, *moments_of_latents(mixture))


def combine(problem: Problem, scales: Scales, state: State) -> float:
    """Mean and covariance of the shared effects from all stand-ins; log of their integral."""
    effects = problem.effects
    n = len(effects.names)
    pull = np.zeros(n + 1)
    for batch, site in zip(problem.batches, state.sites, strict=True):
        shift = np.broadcast_to(site.shift[:, :, None], batch.columns.shape)
        pull += np.bincount(batch.columns.ravel(), weights=shift.ravel(), minlength=n + 1)
    pull = pull[:n]
    prior = 1.0 / effects.prior_variance(scales)
    prior[effects.is_day] = state.day_site.precision
    pull = pull + effects.prior_mean * prior
    pull[effects.is_day] += state.day_site.shift
    values = assemble(problem.assembly, [site.precision for site in state.sites])
    solved = solve(effects, problem.assembly, values, prior, pull)
    state.mean[:n] = solved.mean
    state.covariance = solved.covariance
    fixed = ~effects.is_day
    known = 0.5 * np.sum(np.log(prior[fixed]) - effects.prior_mean[fixed] ** 2 * prior[fixed])
    days = 0.5 * np.sum(~fixed) * np.log(2.0 * np.pi)
    return float(known + days + 0.5 * solved.mean @ pull - solved.half_log_det)


def cavity_of(columns: NDArray[np.int64], site: Site, state: State) -> tuple[Floats, Floats]:
    """Mean (B, R) and covariance (B, R, R) of what the rows see, without the site's own contribution."""
    seen_mean = state.mean[columns].sum(axis=-1)
    if isinstance(state.covariance, Thin):
        without = state.covariance.without(columns, site.precision)
    else:
        seen = between(state.covariance, columns, columns)
        without = seen @ np.linalg.inv(np.eye(seen.shape[1]) - site.precision @ seen)
    without = 0.5 * (without + without.transpose(0, 2, 1))
    own = np.einsum("bij,bj->bi", site.precision, seen_mean) - site.shift
    return seen_mean + np.einsum("bij,bj->bi", without, own), without


def renewed(gradient: Floats, curvature: Floats, mean: Floats, covariance: Floats) -> Site:
    """The Gaussian that, beside the cavity, has the tilted distribution's moments; its precision kept from going
    negative."""
    precision = np.linalg.solve(np.eye(curvature.shape[1]) - curvature @ covariance, curvature)
    precision = no_negative(0.5 * (precision + precision.transpose(0, 2, 1)))
    moved = mean + np.einsum("bij,bj->bi", covariance, gradient)
    return Site(precision, gradient + np.einsum("bij,bj->bi", precision, moved))


def no_negative(matrices: Floats) -> Floats:
    """Negative eigenvalues, of units whose posterior has two peaks, set to zero."""
    doubtful = ~positive_definite(matrices)
    if doubtful.any():
        values, vectors = np.linalg.eigh(matrices[doubtful])
        matrices[doubtful] = (vectors * np.maximum(values, 0.0)[:, None, :]) @ vectors.transpose(0, 2, 1)
    return matrices


def positive_definite(matrices: Floats) -> NDArray[np.bool_]:
    """By elimination of all at once: a factorisation would stop at the first that isn't, without saying which.

    Rows of zeros, where a unit has fewer readings than its batch, are as good as gone.
    """
    left = matrices.copy()
    fine = np.ones(len(left), dtype=np.bool_)
    empty = np.asarray(~np.any(matrices, axis=2))
    for k in range(left.shape[1]):
        pivot = np.where(empty[:, k], 1.0, left[:, k, k])
        fine &= pivot > 1e-12
        scaled = np.where(fine[:, None], left[:, k, k + 1 :] / np.where(fine, pivot, 1.0)[:, None], 0.0)
        left[:, k + 1 :, k + 1 :] -= left[:, k + 1 :, k][:, :, None] * scaled[:, None, :]
    return fine


def log_overlap(site: Site, mean: Floats, covariance: Floats) -> Floats:
    """Log integral of the stand-in exp(shift'x - x'precision x / 2) over the cavity N(mean, covariance)."""
    ratio = np.eye(covariance.shape[1]) + covariance @ site.precision
    pull = site.shift - np.einsum("bij,bj->bi", site.precision, mean)
    moved = np.linalg.solve(ratio, np.einsum("bij,bj->bi", covariance, pull)[..., None])[..., 0]
    linear = np.einsum("bi,bi->b", site.shift + pull, mean) * 0.5
    return np.asarray(linear + 0.5 * np.einsum("bi,bi->b", pull, moved) - 0.5 * np.linalg.slogdet(ratio)[1])


def sweep_days(effects: Effects, scales: Scales, state: State) -> tuple[float, Floats, Floats]:
    place = np.flatnonzero(effects.is_day)
    mean, variance = state.mean[place], variances(state.covariance)[place]
    site = state.day_site
    cavity = 1.0 / np.maximum(1.0 / variance - site.precision, 1e-6)
    cavity_mean = cavity * (mean / variance - site.shift)
    found = day_prior(scales, cavity_mean, cavity, effects.lonely[place])
    one = Site(site.precision[:, None, None], site.shift[:, None])
    overlap = log_overlap(one, cavity_mean[:, None], cavity[:, None, None])
    curvature = np.clip(found.curvature, 1e-9, (1.0 - 1e-10) / cavity)
    # A day between good and bad looks wider than either; without a floor its stand-in would say nothing at all.
    precision = np.maximum(curvature / (1.0 - curvature * cavity), 0.25 / scales.bad_day_sd**2)
    shift = found.gradient + precision * (cavity_mean + cavity * found.gradient)
    # Half a step where in doubt: a bad day and a slip can explain the same reading, and whole steps would chase each
    # other for ever.
    step = np.where(np.abs(found.bad - 0.5) < 0.49, 0.5, 1.0)
    state.day_site = Site(
        site.precision + step * (precision - site.precision), site.shift + step * (shift - site.shift)
    )
    return float(np.sum(found.log_evidence - overlap)), found.score, found.bad


def group_scores(problem: Problem, scales: Scales, state: State) -> tuple[Floats, Floats]:
    """(g,) and their variances: a value with mean m and variance v has the score (m^2 + v) / sd^2 - 1, where m^2 is
    expected to be sd^2 - v."""
    slots = problem.effects.variance_slot
    mean, variance = state.mean[:-1], variances(state.covariance)
    score, information = np.zeros((2, len(problem.layout.group_sds)))
    for g, sd in enumerate(scales.group_sds):
        mine = slots == g
        score[g] = np.sum((mean[mine] ** 2 + variance[mine]) / sd**2 - 1.0)
        information[g] = 2.0 * np.sum((1.0 - variance[mine] / sd**2) ** 2)
    return score, information


def set_up(batch: Batch, scales: Scales, clock: Clock, mean: Floats, covariance: Floats) -> Setup:
    def each(value: Floats) -> Floats:
        return np.broadcast_to(value, (len(batch.unit), *value.shape))

    return Setup(
        batch,
        clock.at_readings[batch.reading] * batch.real,
        mean,
        covariance,
        each(scales.level_sd**2),
        each(scales.residual_sd**2),
        each(scales.latent_sds**2),
        np.broadcast_to(scales.slip_odds, batch.real.shape),
        each(scales.damage_odds),
        each(scales.shape),
    )
