"""From a kept fit to one unit's, or many units', distribution of the true sensitivity: no refit, numpy only.

Every unit sees the shared effects without its own old contribution (its cavity), then all of its readings, old and
new, are
put on top. Draws are deterministic, equally weighted, and joint over shape, hyper-parameters, latents, level and
damage.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from electrolog.fouling.batches import Batch, pad_units
from electrolog.fouling.clock import Clock, log_area_changes, run_clock
from electrolog.fouling.covariance import Covariance, between, extended
from electrolog.fouling.draws import Posterior, Strand
from electrolog.fouling.effects import Effects
from electrolog.fouling.events import READING, Events
from electrolog.fouling.fates import damage_chances, slip_chances
from electrolog.fouling.fit import CohortFit, Component
from electrolog.fouling.line_error import LineError
from electrolog.fouling.parameters import Scales, prior_draws, read_scales
from electrolog.fouling.quadrature import Grid, Setup, Tilted, refit_grid, starting_grid, tilt
from electrolog.fouling.sampling import sample

Floats = NDArray[np.float64]
Integers = NDArray[np.int64]
__all__ = ["Posterior", "posterior"]
DRAWS = 1024
CHUNK = 800  # pairs of unit and hyper-parameter draw worked on at once


def posterior(fit: CohortFit, events: Events) -> Posterior:
    is_reading = events.kind == READING
    at_readings, at_end = log_area_changes(events)
    counts = np.bincount(events.unit[is_reading], minlength=len(events.units))
    slipped, damaged = np.zeros(int(is_reading.sum())), np.zeros(len(events.units))
    strands = []
    for place, part in enumerate(fit.components):
        strands.append(draw_strand(part, place, events, fit.line_error, per_theta(part), slipped, damaged))
    first = np.cumsum(counts) - counts
    return Posterior(tuple(strands), first, counts, at_end, at_readings, slipped, damaged)


def per_theta(part: Component) -> int:
    """How many draws of a unit there are under each draw of the hyper-parameters."""
    return max(1, round(DRAWS * part.weight / len(part.theta_draws)))


@dataclass(frozen=True)
class View:
    """A component seen from new events: shared effects with columns for names that the fit didn't know."""

    part: Component
    effects: Effects
    mean: Floats  # (F + 1,)
    mean_draws: Floats  # (K, F + 1)
    covariance: Covariance
    old_columns: Integers  # new place of each of the fit's columns, and of "none"


def draw_strand(
    part: Component, place: int, events: Events, line: LineError, per_theta: int, slipped: Floats, damaged: Floats
) -> Strand:
    view = widen(part, events)
    scales = known_scales(part, events, place)
    peak = known_scales(part, events, place, at_peak=True)
    clock = run_clock(events, scales.weight, scales.recovery)
    peak_clock = run_clock(events, peak.weight, peak.recovery)
    n_units, k, q = len(events.units), len(part.theta_draws), len(part.layout.shape.latents)
    latents, level = np.zeros((n_units, k, per_theta, q)), np.zeros((n_units, k, per_theta))
    damage, since = np.zeros_like(level), np.zeros(level.shape, dtype=np.int64)
    for units, size in groups_by_size(events, k):
        batch = pad_units(units, size, events, view.effects, q, line)
        cavity = cavities(view, batch, events)
        grid = peak_grid(view, batch, cavity, peak, peak_clock)
        pairs = set_up_pairs(view, batch, cavity, scales, clock)
        tilted, grid = tilt_pairs(part, pairs, grid)
        found = sample(tilted, grid, pairs, cavity_of_level(cavity, batch, view), per_theta)
        at = units
        latents[at], level[at], damage[at], since[at] = (x.reshape(len(units), k, *x.shape[1:]) for x in found)
        by_fate = tilted.probability.sum(axis=1).reshape(len(units), k, -1).mean(axis=1)
        slipped[batch.reading[batch.real]] += part.weight * slip_chances(by_fate, size)[batch.real]
        damaged[at] += part.weight * damage_chances(by_fate, size).sum(axis=1)
    return Strand(part, scales.shape, scales.weight, clock.at_end, clock.at_readings, latents, level, damage, since)


def groups_by_size(events: Events, k: int) -> list[tuple[Integers, int]]:
    """Units in chunks of alike numbers of readings, so that padding and memory stay small."""
    counts = np.bincount(events.unit[events.kind == READING], minlength=len(events.units))
    order = np.argsort(counts, kind="stable")
    chunks = np.array_split(order, max(1, -(-len(order) * k // CHUNK)))
    return [(chunk, max(1, int(counts[chunk].max()))) for chunk in chunks if len(chunk)]


def widen(part: Component, events: Events) -> View:
    known = set(part.effects.names)
    new: list[tuple[str, ...]] = []
    variances = []
    scales = read_scales(part.layout, part.theta)
    for g, (what, factor) in enumerate(part.layout.group_sds):
        fresh = sorted({(what, factor, v) for v in events.groups.get(factor, ()) if v} - known)
        new += fresh
        variances += [float(scales.group_sds[g]) ** 2] * len(fresh)
    days = sorted({("day", events.days[d]) for d in events.which[events.kind == READING]} - known)
    new += days
    variances += [float(scales.day_sd) ** 2] * len(days)
    n, more = len(part.effects.names), len(new)
    covariance = extended(part.covariance, np.array(variances))
    names = part.effects.names + tuple(new)
    slots = np.concatenate([part.effects.variance_slot, np.full(more, -1)])
    effects = Effects(names, np.zeros(n + more), np.zeros(n + more), slots)
    padded = np.concatenate([part.mean, np.zeros(more + 1)])
    draws = np.concatenate([part.mean_draws, np.zeros((len(part.mean_draws), more + 1))], axis=1)
    return View(part, effects, padded, draws, covariance, np.append(np.arange(n), n + more))


def known_scales(part: Component, events: Events, place: int, at_peak: bool = False) -> Scales:
    """Hyper-parameters with the settings and renewals in the events' own order; unknown ones drawn from their priors.

    place: of the component in its fit; a component may hold one draw only, and each is to get another one of the prior.
    """
    theta = part.theta[None] if at_peak else part.theta_draws
    scales = read_scales(part.layout, theta)
    spin = None if at_peak else place
    weight = reorder(scales.weight, part.layout.settings, events.settings, "weight", spin)
    recovery = reorder(scales.recovery, part.layout.renewals, events.renewals, "recovery", spin)
    return Scales(**{**scales.__dict__, "weight": weight, "recovery": recovery})


def reorder(values: Floats, known: tuple[str, ...], asked: tuple[str, ...], what: str, spin: int | None) -> Floats:
    """spin None: unknown ones at their prior's median."""
    columns = []
    for k, name in enumerate(asked):
        if name in known:
            columns.append(values[:, known.index(name)])
        else:
            columns.append(prior_draws(what, name, len(values), None if spin is None else spin + k))
    return np.stack(columns, axis=-1) if columns else np.zeros((len(values), 0))


def cavities(view: View, batch: Batch, events: Events) -> tuple[Floats, Floats]:
    """What each unit's rows and its level see of the shared effects: means (K, B, R + 1), covariances (B, R + 1, R
    + 1)."""
    level = np.full((len(batch.unit), 1, batch.columns.shape[2]), len(view.effects.names))
    level[:, 0, : batch.level_columns.shape[1]] = batch.level_columns
    rows = np.concatenate([batch.columns, level], axis=1)
    means = view.mean_draws[:, rows].sum(axis=-1)
    joint = between(view.covariance, rows, rows)
    for kept in view.part.units:
        place = {label: k for k, label in enumerate(kept.labels)}
        pairs = [(k, place[events.units[u]]) for k, u in enumerate(batch.unit) if events.units[u] in place]
        if not pairs:
            continue
        here, there = np.array(pairs).T
        old = view.old_columns[kept.columns[there]]
        cross, own = between(view.covariance, rows[here], old), between(view.covariance, old, old)
        precision = kept.precision[there]
        gain = cross @ np.linalg.inv(np.eye(own.shape[1]) - precision @ own)
        joint[here] += gain @ precision @ cross.transpose(0, 2, 1)
        seen = view.mean_draws[:, old].sum(axis=-1)
        pull = np.einsum("bij,kbj->kbi", precision, seen) - kept.shift[there]
        means[:, here] += np.einsum("bij,kbj->kbi", gain, pull)
    return means, 0.5 * (joint + joint.transpose(0, 2, 1))


def set_up_pairs(view: View, batch: Batch, cavity: tuple[Floats, Floats], scales: Scales, clock: Clock) -> Setup:
    """Every unit with every draw of the hyper-parameters: B K rows, the draw running fastest."""
    means, joint = cavity
    k, b = means.shape[:2]

    def per_unit(value: Floats) -> Floats:
        return np.repeat(value, k, axis=0)

    def per_draw(value: Floats) -> Floats:
        return np.tile(value, (b, *[1] * (value.ndim - 1)))

    hours = clock.at_readings[:, batch.reading].transpose(1, 0, 2) if clock.at_readings.shape[1] else None
    shown = np.zeros((b, k, batch.real.shape[1])) if hours is None else hours
    pairs = batch.repeated(k)
    # A reading on a day that the fit never saw may be off because that day was bad: beside a slip, one more chance.
    new_day = pairs.real & (pairs.columns[:, len(view.part.layout.shape.latents) :, -1] >= len(view.part.effects.names))
    slip_odds = per_draw(scales.slip_odds)[:, None] + new_day * per_draw(scales.bad_day_odds)[:, None]
    return Setup(
        pairs,
        shown.reshape(b * k, -1) * pairs.real,
        means.transpose(1, 0, 2)[:, :, :-1].reshape(b * k, -1),
        per_unit(joint[:, :-1, :-1]),
        per_draw(scales.level_sd**2),
        per_draw(scales.residual_sd**2),
        per_draw(scales.latent_sds**2),
        slip_odds,
        per_draw(scales.damage_odds),
        per_draw(scales.shape),
    )


def peak_grid(view: View, batch: Batch, cavity: tuple[Floats, Floats], peak: Scales, clock: Clock) -> Grid:
    """Grids at the most probable hyper-parameters, where those of all draws start."""
    at_peak = (cavity[0].mean(axis=0, keepdims=True), cavity[1])
    setup = set_up_pairs(view, batch, at_peak, peak, clock)
    grid = starting_grid(setup)
    for _ in range(6):
        grid = refit_grid(tilt(view.part.layout.shape, setup, grid), grid)
    k = len(view.part.theta_draws)
    if k == 1:
        return grid
    return Grid(np.repeat(grid.centre, k, axis=0), np.repeat(grid.spread, k, axis=0) * 1.2)


def tilt_pairs(part: Component, setup: Setup, grid: Grid) -> tuple[Tilted, Grid]:
    if len(part.theta_draws) > 1:  # a single draw stands at the peak, where its grid was laid already
        grid = refit_grid(tilt(part.layout.shape, setup, grid), grid)
    return tilt(part.layout.shape, setup, grid), grid


def cavity_of_level(cavity: tuple[Floats, Floats], batch: Batch, view: View) -> tuple[Floats, Floats]:
    """Per pair: mean (B K,) of the unit's expected level, and its covariance with every row and itself (B K, R + 1)."""
    means, joint = cavity
    k = len(means)
    return means[:, :, -1].T.ravel(), np.repeat(joint[:, -1, :], k, axis=0)
