"""Units with about as many readings each, padded to one size, so that small matrices can be worked on all at once."""

from __future__ import annotations

from dataclasses import dataclass
from itertools import pairwise

import numpy as np
from numpy.typing import NDArray

from electrolog.fouling.clock import log_area_changes
from electrolog.fouling.effects import Effects, columns_of_days, columns_of_units
from electrolog.fouling.events import READING, Events
from electrolog.fouling.line_error import LineError

Floats = NDArray[np.float64]
Integers = NDArray[np.int64]
CHUNK = 600  # units: a batch and what is computed from it should stay in a processor's cache
SIZES = (2, 4, 7, 12, 20, 40, 80, 160, 320, 640)


@dataclass(frozen=True)
class Batch:
    """B units with up to n readings. Padding: real False, log_sensitivity 0, columns F (none)."""

    unit: Integers  # (B,)
    reading: Integers  # (B, n) place among all readings, 0 where padded
    real: NDArray[np.bool_]  # (B, n)
    log_sensitivity: Floats  # (B, n) less the log area changes so far
    variance: Floats  # (B, n) of the line's own error
    columns: Integers  # (B, q + n, e) of the shared effects: latents first, then readings
    level_columns: Integers  # (B, e)

    def repeated(self, times: int) -> Batch:
        """Every unit so many times, one after the other."""
        return self.take(np.repeat(np.arange(len(self.unit)), times))

    def take(self, rows: Integers) -> Batch:
        return Batch(
            self.unit[rows],
            self.reading[rows],
            self.real[rows],
            self.log_sensitivity[rows],
            self.variance[rows],
            self.columns[rows],
            self.level_columns[rows],
        )


@dataclass(frozen=True)
class Flat:
    """All units' readings one after the other (M), and what each sees of the shared effects, before they are padded."""

    owner: Integers  # (M,) unit
    log_sensitivity: Floats  # (M,) less the log area changes so far
    variance: Floats  # (M,) of the line's own error
    day_column: Integers  # (M,)
    latent_columns: Integers  # (U, q, e)
    level_columns: Integers  # (U, e)
    no_column: int


def flatten(events: Events, effects: Effects, n_latents: int, line: LineError) -> Flat:
    is_reading = events.kind == READING
    return Flat(
        events.unit[is_reading],
        events.amount[is_reading] - log_area_changes(events)[0],
        line.moderated(events.se[is_reading]),
        columns_of_days(effects, events.days)[events.which[is_reading]],
        *columns_of_units(effects, events, n_latents),
        no_column=len(effects.names),
    )


def make_batches(events: Events, effects: Effects, n_latents: int, line: LineError) -> list[Batch]:
    """Every unit that has a reading, in batches by number of readings."""
    flat = flatten(events, effects, n_latents, line)
    counts = np.bincount(flat.owner, minlength=len(events.units))
    sizes = [s for s in SIZES if s < counts.max(initial=1)]
    edges = np.array([0, *sizes, counts.max(initial=1)])
    batches = []
    for low, high in pairwise(edges):
        units = np.flatnonzero((counts > low) & (counts <= high))
        chunks = np.array_split(units, -(-len(units) // CHUNK)) if len(units) else []
        batches += [pad_units(flat, chunk, int(high)) for chunk in chunks]
    return batches


def pad_units(flat: Flat, units: Integers, size: int) -> Batch:
    first = np.searchsorted(flat.owner, units, side="left")
    count = np.searchsorted(flat.owner, units, side="right") - first
    within = np.arange(size)
    real = within < count[:, None]
    reading = np.where(real, first[:, None] + within, 0)
    none, level, latents = flat.no_column, flat.level_columns[units], flat.latent_columns[units]
    seen = np.full((len(units), size, level.shape[1] + 1), none)
    y, variance = np.zeros((2, len(units), size))
    if size and len(flat.owner):
        seen[:, :, :-1] = np.where(real[:, :, None], level[:, None, :], none)
        seen[:, :, -1] = np.where(real, flat.day_column[reading], none)
        y = np.where(real, flat.log_sensitivity[reading], 0.0)
        variance = np.where(real, flat.variance[reading], 0.0)
    widened = np.full((len(units), latents.shape[1], seen.shape[2]), none)
    widened[:, :, : latents.shape[2]] = latents
    return Batch(units, reading, real, y, variance, np.concatenate([widened, seen], axis=1), level)
