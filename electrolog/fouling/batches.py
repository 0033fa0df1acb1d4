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


def make_batches(events: Events, effects: Effects, n_latents: int, line: LineError) -> list[Batch]:
    """Every unit that has a reading, in batches by number of readings."""
    is_reading = events.kind == READING
    owner = events.unit[is_reading]
    counts = np.bincount(owner, minlength=len(events.units))
    sizes = [s for s in SIZES if s < counts.max(initial=1)]
    edges = np.array([0, *sizes, counts.max(initial=1)])
    batches = []
    for low, high in pairwise(edges):
        units = np.flatnonzero((counts > low) & (counts <= high))
        chunks = np.array_split(units, -(-len(units) // CHUNK)) if len(units) else []
        batches += [pad_units(chunk, int(high), events, effects, n_latents, line) for chunk in chunks]
    return batches


def pad_units(units: Integers, size: int, events: Events, effects: Effects, n_latents: int, line: LineError) -> Batch:
    is_reading = events.kind == READING
    owner = events.unit[is_reading]
    level_seen = events.amount[is_reading] - log_area_changes(events)[0]
    line_variance = line.moderated(events.se[is_reading])
    day = columns_of_days(effects, events.days)[events.which[is_reading]]
    first = np.searchsorted(owner, units, side="left")
    count = np.searchsorted(owner, units, side="right") - first
    within = np.arange(size)
    real = within < count[:, None]
    reading = np.where(real, first[:, None] + within, 0)
    latents, level = columns_of_units(effects, events, n_latents)
    none = len(effects.names)
    level = level[units]
    seen = np.full((len(units), size, level.shape[1] + 1), none)
    if size and len(owner):
        seen[:, :, :-1] = np.where(real[:, :, None], level[:, None, :], none)
        seen[:, :, -1] = np.where(real, day[reading], none)
        y = np.where(real, level_seen[reading], 0.0)
        variance = np.where(real, line_variance[reading], 0.0)
    else:
        y, variance = np.zeros((len(units), size)), np.zeros((len(units), size))
    widened = np.full((len(units), n_latents, seen.shape[2]), none)
    widened[:, :, : latents.shape[2]] = latents[units]
    return Batch(units, reading, real, y, variance, np.concatenate([widened, seen], axis=1), level)
