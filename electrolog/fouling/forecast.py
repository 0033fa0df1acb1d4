"""From a kept fit to one unit's, or many units', distribution of the true sensitivity: no refit, numpy only.

Every unit sees the shared effects without its own old contribution (its cavity), then all of its readings, old and new, are
put on top. Draws are deterministic, equally weighted, and joint over shape, hyper-parameters, latents, level and damage.
"""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from electrolog.fouling.batches import Batch, pad_units
from electrolog.fouling.clock import Clock, log_area_changes, run_clock
from electrolog.fouling.covariance import Covariance, between, extended
from electrolog.fouling.effects import Effects
from electrolog.fouling.events import READING, Events
from electrolog.fouling.fit import CohortFit, Component
from electrolog.fouling.line_error import LineError
from electrolog.fouling.parameters import Scales, prior_draws, read_scales
from electrolog.fouling.points import even_points
from electrolog.fouling.quadrature import (
    Grid,
    Setup,
    Tilted,
    refit_grid,
    standard_nodes,
    starting_grid,
    tilt,
)

Floats = NDArray[np.float64]
Integers = NDArray[np.int64]
DRAWS = 1024
CHUNK = 800  # pairs of unit and hyper-parameter draw worked on at once


@dataclass(frozen=True)
class Strand:
    """The draws under one shape: K draws of hyper-parameters, S of each unit under each; K S = D_shape."""

    component: Component
    shape_parameters: Floats  # (K, p)
    weight: Floats  # (K, S) settings' weights
    hours_at_end: Floats  # (K, U)
    hours_at_readings: Floats  # (K, M)
    latents: Floats  # (U, K, S, q)
    level: Floats  # (U, K, S) as it was before any damage
    damage: Floats  # (U, K, S) shift, 0 where none
    damaged_from: Integers  # (U, K, S) place of the first reading after the damage


@dataclass(frozen=True)
class Posterior:
    """D equally weighted joint draws per unit; see the methods. `slipped` (M,) and `damaged` (U,) are probabilities."""

    strands: tuple[Strand, ...]
    first_reading: Integers  # (U,)
    n_readings: Integers  # (U,)
    log_area_at_end: Floats
    log_area_at_readings: Floats
    slipped: Floats
    damaged: Floats

    def log_sensitivity(self, extra_hours: Floats) -> Floats:
        """True log sensitivity (log nA/µM) after extra_hours (U, S) more in each setting: (U, D)."""
        parts = [later(strand, extra_hours) + strand.level + strand.damage for strand in self.strands]
        return joined(parts) + self.log_area_at_end[:, None]

    def log_sensitivity_at_reading(self, which: Integers) -> Floats:
        """True log sensitivity when reading which (U,) of each unit (0 is its first) was taken: (U, D)."""
        return joined([self._at(strand, which) for strand in self.strands]) + self._area(which)[:, None]

    def log_fraction_left(self, extra_hours: Floats, reference_reading: Integers) -> Floats:
        """Log of the sensitivity after extra_hours (U, S) over that at the reference reading (U,): (U, D)."""
        return self.log_sensitivity(extra_hours) - self.log_sensitivity_at_reading(reference_reading)

    def only(self, places: Integers) -> Posterior:
        """The same draws for some of the units."""
        strands = tuple(
            replace(
                strand,
                hours_at_end=strand.hours_at_end[:, places],
                latents=strand.latents[places],
                level=strand.level[places],
                damage=strand.damage[places],
                damaged_from=strand.damaged_from[places],
            )
            for strand in self.strands
        )
        return replace(
            self,
            strands=strands,
            first_reading=self.first_reading[places],
            n_readings=self.n_readings[places],
            log_area_at_end=self.log_area_at_end[places],
            damaged=self.damaged[places],
        )

    def _rows(self, which: Integers) -> Integers:
        if np.any((which < 0) | (which >= self.n_readings)):
            raise IndexError("a unit has no such reading")
        return self.first_reading + which

    def _area(self, which: Integers) -> Floats:
        return self.log_area_at_readings[self._rows(which)]

    def _at(self, strand: Strand, which: Integers) -> Floats:
        hours = strand.hours_at_readings[:, self._rows(which)].T[:, :, None]
        broken = strand.damaged_from <= which[:, None, None]
        return strand.level + np.where(broken, strand.damage, 0.0) - loss_at(strand, hours)


def joined(parts: list[Floats]) -> Floats:
    return np.concatenate([part.reshape(len(part), -1) for part in parts], axis=1)


def later(strand: Strand, extra_hours: Floats) -> Floats:
    hours = strand.hours_at_end.T + extra_hours @ strand.weight.T
    return -loss_at(strand, hours[:, :, None])


def loss_at(strand: Strand, hours: Floats) -> Floats:
    """hours (U, K, 1) -> (U, K, S)."""
    value = strand.component.layout.shape.loss(hours, strand.latents, strand.shape_parameters[None, :, None, :]).value
    return np.broadcast_to(value, strand.level.shape)


def posterior(fit: CohortFit, events: Events) -> Posterior:
    is_reading = events.kind == READING
    at_readings, at_end = log_area_changes(events)
    counts = np.bincount(events.unit[is_reading], minlength=len(events.units))
    slipped, damaged = np.zeros(int(is_reading.sum())), np.zeros(len(events.units))
    strands, total = [], sum(len(part.theta_draws) for part in fit.components)
    for part in fit.components:
        strand = draw_strand(part, events, fit.line_error, max(1, round(DRAWS / total)), slipped, damaged)
        strands.append(strand)
    first = np.cumsum(counts) - counts
    return Posterior(tuple(strands), first, counts, at_end, at_readings, slipped, damaged)


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
    part: Component, events: Events, line: LineError, per_theta: int, slipped: Floats, damaged: Floats
) -> Strand:
    view = widen(part, events)
    scales = known_scales(part, events)
    peak = known_scales(part, events, at_peak=True)
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
        slipped[batch.reading[batch.real]] += part.weight * by_fate[:, 1 : 1 + size][batch.real]
        damaged[at] += part.weight * by_fate[:, 1 + size :].sum(axis=1)
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


def known_scales(part: Component, events: Events, at_peak: bool = False) -> Scales:
    """Hyper-parameters with the settings and renewals in the events' own order; unknown ones drawn from their priors."""
    theta = part.theta[None] if at_peak else part.theta_draws
    scales = read_scales(part.layout, theta)
    weight = reorder(scales.weight, part.layout.settings, events.settings, "weight", at_peak)
    recovery = reorder(scales.recovery, part.layout.renewals, events.renewals, "recovery", at_peak)
    return Scales(**{**scales.__dict__, "weight": weight, "recovery": recovery})


def reorder(values: Floats, known: tuple[str, ...], asked: tuple[str, ...], what: str, at_peak: bool) -> Floats:
    columns = []
    for k, name in enumerate(asked):
        if name in known:
            columns.append(values[:, known.index(name)])
        else:
            columns.append(prior_draws(what, name, 1 if at_peak else len(values), k))
    return np.stack(columns, axis=-1) if columns else np.zeros((len(values), 0))


def cavities(view: View, batch: Batch, events: Events) -> tuple[Floats, Floats]:
    """What each unit's rows and its level see of the shared effects: means (K, B, R + 1), covariances (B, R + 1, R + 1)."""
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
    pairs = Batch(*(per_unit(getattr(batch, name)) for name in Batch.__dataclass_fields__))
    return Setup(
        pairs,
        shown.reshape(b * k, -1) * pairs.real,
        means.transpose(1, 0, 2)[:, :, :-1].reshape(b * k, -1),
        per_unit(joint[:, :-1, :-1]),
        per_draw(scales.level_sd**2),
        per_draw(scales.residual_sd**2),
        per_draw(scales.latent_sds**2),
        per_draw(scales.slip_odds),
        per_draw(scales.damage_odds),
        per_draw(scales.shape),
    )


def peak_grid(view: View, batch: Batch, cavity: tuple[Floats, Floats], peak: Scales, clock: Clock) -> Grid:
    """Grids at the most probable hyper-parameters, where those of all draws start."""
    at_peak = (cavity[0].mean(axis=0, keepdims=True), cavity[1])
    setup = set_up_pairs(view, batch, at_peak, peak, clock)
    grid = starting_grid(setup)
    for _ in range(7):
        grid = refit_grid(tilt(view.part.layout.shape, setup, grid), grid)
    k = len(view.part.theta_draws)
    return Grid(np.repeat(grid.centre, k, axis=0), np.repeat(grid.spread, k, axis=0) * 1.2)


def tilt_pairs(part: Component, setup: Setup, grid: Grid) -> tuple[Tilted, Grid]:
    grid = refit_grid(tilt(part.layout.shape, setup, grid), grid)
    return tilt(part.layout.shape, setup, grid), grid


def cavity_of_level(cavity: tuple[Floats, Floats], batch: Batch, view: View) -> tuple[Floats, Floats]:
    """Per pair: mean (B K,) of the unit's expected level, and its covariance with every row and itself (B K, R + 1)."""
    means, joint = cavity
    k = len(means)
    return means[:, :, -1].T.ravel(), np.repeat(joint[:, -1, :], k, axis=0)


def sample(
    tilted: Tilted, grid: Grid, setup: Setup, level: tuple[Floats, Floats], per_theta: int
) -> tuple[Floats, Floats, Floats, Integers]:
    """S draws per pair: latents (B, S, q), level before damage (B, S), damage (B, S), and the reading it came before."""
    from scipy.special import ndtri

    n_pairs, n_nodes, n_fates = tilted.probability.shape
    q, n = tilted.nodes.shape[2], setup.batch.real.shape[1]
    points = even_points(n_pairs * per_theta, 3 + q).reshape(n_pairs, per_theta, 3 + q)
    ranks = (np.arange(per_theta) + points[:, :, 0]) / per_theta
    steps = np.cumsum(tilted.probability.reshape(n_pairs, -1), axis=1)
    cell = np.minimum((ranks[:, :, None] * steps[:, -1:, None] > steps[:, None, :]).sum(axis=2), n_nodes * n_fates - 1)
    node, fate = cell // n_fates, cell % n_fates
    pair = np.arange(n_pairs)[:, None]
    standard = standard_nodes(q)
    within = standard.place[node] + (points[:, :, 3:] - 0.5) * standard.sides[node]
    which = standard.grid[node]
    latents = grid.centre[pair, which] + np.einsum("bsij,bsj->bsi", grid.spread[pair, which], within)
    z = ndtri(points[:, :, 1:3])
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
    is_damage = fate > n
    return latents, drawn, np.where(is_damage, shift, 0.0), np.where(is_damage, fate - 1 - n, 0)
