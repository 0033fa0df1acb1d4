"""From a kept fit to one unit's, or many units', distribution of the true sensitivity: no refit, numpy only.

Every unit sees the shared effects without its own old contribution (its cavity), then all of its readings, old and
new, are
put on top. Draws are deterministic, equally weighted, and joint over shape, hyper-parameters, latents, level and
damage.
"""

from __future__ import annotations

from dataclasses import replace
from itertools import groupby
from zlib import crc32

import numpy as np
from numpy.typing import NDArray

from electrolog.fouling.batches import Batch, flatten, pad_units
from electrolog.fouling.clock import Clock, log_area_changes, run_clock
from electrolog.fouling.draws import Posterior, Strand
from electrolog.fouling.events import READING, Events
from electrolog.fouling.fit import CohortFit, Component
from electrolog.fouling.line_error import LineError
from electrolog.fouling.mixture import Grids, Mixture, refit_grids, settle_grids, weigh
from electrolog.fouling.parameters import Scales, prior_draws, read_scales
from electrolog.fouling.quadrature import Grid, Setup
from electrolog.fouling.sampling import sample
from electrolog.fouling.views import Cavity, View, cavities, widen

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
    strands: list[Strand] = []
    points = own_points(events.units)
    for parts in of_one_shape(fit.components):
        strands += draw_strands(parts, len(strands), events, fit.line_error, points, slipped, damaged)
        points = points + sum(len(part.theta_draws) * per_theta(part) for part in parts)
    first = np.cumsum(counts) - counts
    return Posterior(tuple(strands), first, counts, at_end, at_readings, slipped, damaged)


def of_one_shape(components: tuple[Component, ...]) -> list[tuple[Component, ...]]:
    """Components drawn from at once: a young cohort has dozens, alike in all but numbers."""
    alike = groupby(components, lambda part: (part.layout.shape.name, per_theta(part)))
    return [tuple(parts) for _, parts in alike]


def own_points(units: tuple[str, ...]) -> Integers:
    """Where each unit's even points begin: the same whoever else is asked about, and others' elsewhere.

    A unit's draws go on from one component to the next: were they to begin anew, every component would draw the same
    few errors, and the tails of a forecast would rest on those.
    """
    return np.array([crc32(label.encode()) % 1_000_003 for label in units], dtype=np.int64)


def per_theta(part: Component) -> int:
    """How many draws of a unit there are under each draw of the hyper-parameters."""
    return max(1, round(DRAWS * part.weight / len(part.theta_draws)))


def draw_strands(
    parts: tuple[Component, ...],
    place: int,
    events: Events,
    line: LineError,
    points: Integers,
    slipped: Floats,
    damaged: Floats,
) -> list[Strand]:
    """place: of the first part in its fit. Adds to slipped (M,) and damaged (U,)."""
    view = widen(parts, events)
    scales = known_scales(parts, events, place)
    peak = known_scales(parts, events, place, at_peak=True)
    clock = run_clock(events, scales.weight, scales.recovery)
    peak_clock = run_clock(events, peak.weight, peak.recovery)
    n_units, k, q = len(events.units), len(view.owner), len(view.shape.latents)
    each = per_theta(parts[0])
    share = np.array([part.weight / len(part.theta_draws) for part in parts])[view.owner]
    latents, level = np.zeros((n_units, k, each, q)), np.zeros((n_units, k, each))
    damage, since = np.zeros_like(level), np.zeros(level.shape, dtype=np.int64)
    flat = flatten(events, view.effects, q, line)
    for units, size in groups_by_size(events, k):
        batch = pad_units(flat, units, size)
        cavity = cavities(view, batch, events)
        grids = peak_grids(view, batch, cavity, peak, peak_clock)
        pairs = set_up_pairs(view, batch, cavity, scales, clock)
        mixture, grids = weigh_pairs(view, pairs, grids)
        first = (points[units][:, None] + np.arange(k) * each).ravel()
        found = sample(mixture, grids, cavity.of_level(), first, each)
        drawn = (found.latents, found.level, found.damage, found.damaged_from)
        for kept, one in zip((latents, level, damage, since), drawn, strict=True):
            kept[units] = one.reshape(len(units), k, *one.shape[1:])
        by_unit = (len(units), k, size)
        chance = np.einsum("bkn,k->bn", mixture.slipped.reshape(by_unit), share)
        slipped[batch.reading[batch.real]] += chance[batch.real]
        damaged[units] += np.einsum("bkn,k->b", mixture.damaged.reshape(by_unit), share)
    return [
        Strand(
            part,
            scales.shape[mine],
            scales.weight[mine],
            clock.at_end[mine],
            clock.at_readings[mine],
            latents[:, mine],
            level[:, mine],
            damage[:, mine],
            since[:, mine],
        )
        for part, mine in zip(parts, view.slices, strict=True)
    ]


def groups_by_size(events: Events, k: int) -> list[tuple[Integers, int]]:
    """Units in chunks of alike numbers of readings, so that padding and memory stay small."""
    counts = np.bincount(events.unit[events.kind == READING], minlength=len(events.units))
    order = np.argsort(counts, kind="stable")
    chunks = np.array_split(order, max(1, -(-len(order) * k // CHUNK)))
    return [(chunk, max(1, int(counts[chunk].max()))) for chunk in chunks if len(chunk)]


def known_scales(parts: tuple[Component, ...], events: Events, place: int, at_peak: bool = False) -> Scales:
    """Hyper-parameters with the settings and renewals in the events' own order; unknown ones drawn from their priors.

    parts: of one shape; place: of the first in its fit. A component may hold one draw only, and each is to get another
    one of the prior.
    """
    layout = parts[0].layout
    scales = read_scales(layout, np.concatenate([part.theta[None] if at_peak else part.theta_draws for part in parts]))
    spin = None if at_peak else place
    weight = reorder(scales.weight, layout.settings, events.settings, "weight", spin)
    recovery = reorder(scales.recovery, layout.renewals, events.renewals, "recovery", spin)
    return replace(scales, weight=weight, recovery=recovery)


def reorder(values: Floats, known: tuple[str, ...], asked: tuple[str, ...], what: str, spin: int | None) -> Floats:
    """spin None: unknown ones at their prior's median."""
    columns = []
    for k, name in enumerate(asked):
        if name in known:
            columns.append(values[:, known.index(name)])
        else:
            columns.append(prior_draws(what, name, len(values), None if spin is None else spin + k))
    return np.stack(columns, axis=-1) if columns else np.zeros((len(values), 0))


def set_up_pairs(view: View, batch: Batch, cavity: Cavity, scales: Scales, clock: Clock) -> Setup:
    """Every unit with every draw of the hyper-parameters: B K rows, the draw running fastest."""
    b, k = cavity.means.shape[:2]

    def per_draw(value: Floats) -> Floats:
        return np.tile(value, (b, *[1] * (value.ndim - 1)))

    hours = clock.at_readings[:, batch.reading].transpose(1, 0, 2) if clock.at_readings.shape[1] else None
    shown = np.zeros((b, k, batch.real.shape[1])) if hours is None else hours
    pairs = batch.repeated(k)
    # A reading on a day that the fit never saw may be off because that day was bad: beside a slip, one more chance.
    new_day = pairs.real & (pairs.columns[:, len(view.shape.latents) :, -1] >= view.n_known)
    slip_odds = per_draw(scales.slip_odds)[:, None] + new_day * per_draw(scales.bad_day_odds)[:, None]
    means, joint = cavity.of_rows()
    return Setup(
        pairs,
        shown.reshape(b * k, -1) * pairs.real,
        means,
        joint,
        per_draw(scales.level_sd**2),
        per_draw(scales.residual_sd**2),
        per_draw(scales.latent_sds**2),
        slip_odds,
        per_draw(scales.damage_odds),
        per_draw(scales.shape),
    )


def peak_grids(view: View, batch: Batch, cavity: Cavity, peak: Scales, clock: Clock) -> Grids:
    """Grids at each part's most probable hyper-parameters, where those of all its draws start."""
    setup = set_up_pairs(view, batch, cavity.at_peaks(view), peak, clock)
    grids = settle_grids(view.shape, setup)
    if view.at_peak:
        return grids
    pair = (np.arange(len(batch.unit))[:, None] * len(view.slices) + view.owner).ravel()
    well, wrong, third = (Grid(grid.centre[pair], grid.spread[pair] * 1.2, grid.which) for grid in grids)
    return well, wrong, third


def weigh_pairs(view: View, setup: Setup, grids: Grids) -> tuple[Mixture, Grids]:
    if not view.at_peak:
        grids = refit_grids(weigh(view.shape, setup, grids), grids)
    return weigh(view.shape, setup, grids), grids
