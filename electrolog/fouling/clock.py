"""How long has a unit fouled? Hours in each setting, weighted by how fast that setting fouls, less what renewals undid.

The clock E counts hours worth one hour in vivo. An exposure of h hours in setting s adds weight[s] * h; a renewal by
method m gives back the part recovery[m] of what stands on the clock: E becomes (1 - recovery[m]) * E.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from electrolog.fouling.events import EXPOSURE, READING, RENEWAL, Events

Floats = NDArray[np.float64]


@dataclass(frozen=True)
class Clock:
    """Hours worth one hour in vivo, and their slopes in (log weight of each setting, logit recovery of each method).

    at_readings (..., M) in the order of the reading rows, at_end (..., U); slopes have one more axis at the end.
    """

    at_readings: Floats
    at_end: Floats
    reading_slopes: Floats
    end_slopes: Floats


def run_clock(events: Events, weight: Floats, recovery: Floats) -> Clock:
    """Run every unit's events through the clock, for one (S,), (M,) or several (K, S), (K, M) sets of parameters."""
    lead = weight.shape[:-1]
    n_settings, n_methods = len(events.settings), len(events.renewals)
    n_units, n_slopes = len(events.units), n_settings + n_methods
    hours, slopes = np.zeros((*lead, n_units)), np.zeros((*lead, n_units, n_slopes))
    seen_hours, seen_slopes = np.zeros((*lead, len(events.unit))), np.zeros((*lead, len(events.unit), n_slopes))
    for rows in steps_in_life(events):
        kind, unit, which = events.kind[rows], events.unit[rows], events.which[rows]
        exposed = kind == EXPOSURE
        who, setting = unit[exposed], which[exposed]
        gained = weight[..., setting] * events.amount[rows][exposed]
        hours[..., who] += gained
        slopes[..., who, setting] += gained
        renewed = kind == RENEWAL
        who, method = unit[renewed], which[renewed]
        undone = recovery[..., method]
        slopes[..., who, :] *= (1.0 - undone)[..., None]
        slopes[..., who, n_settings + method] -= hours[..., who] * undone * (1.0 - undone)
        hours[..., who] *= 1.0 - undone
        read = rows[kind == READING]
        seen_hours[..., read] = hours[..., events.unit[read]]
        seen_slopes[..., read, :] = slopes[..., events.unit[read], :]
    is_reading = events.kind == READING
    return Clock(seen_hours[..., is_reading], hours, seen_slopes[..., is_reading, :], slopes)


def steps_in_life(events: Events) -> list[NDArray[np.int64]]:
    """Rows of every unit's first event, then of every unit's second, and so on."""
    rank = np.arange(len(events.unit)) - np.searchsorted(events.unit, events.unit, side="left")
    by_rank = np.argsort(rank, kind="stable")
    return np.split(by_rank, np.cumsum(np.bincount(rank))[:-1]) if len(rank) else []


def log_area_changes(events: Events) -> tuple[Floats, Floats]:
    """Sum of log area changes by re-cuts up to each reading (M,) and to the end of each unit's events (U,)."""
    change = np.where(events.kind == RENEWAL, events.amount, 0.0)
    total = np.cumsum(change)
    first = np.searchsorted(events.unit, np.arange(len(events.units)), side="left")
    before = np.concatenate([[0.0], total])[first]
    within = total - before[events.unit]
    at_end = np.bincount(events.unit, weights=change, minlength=len(events.units))
    return within[events.kind == READING], at_end.astype(np.float64)
