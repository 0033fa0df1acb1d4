"""A part of a large cohort that can stand for it while shapes are told apart."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from electrolog.fouling.events import READING, Events

Integers = NDArray[np.int64]
STRETCHES = 3


def neighbours_in_time(events: Events, count: int) -> Integers:
    """`count` units (in their own order) from early, middle and late stretches of the lab's time.

    Those of a stretch were measured at about the same time, so that they share their days; and a lab that did something
    else for a while isn't told by that while alone.
    """
    read = events.kind == READING
    n_readings = np.bincount(events.unit[read], minlength=len(events.units))
    mean_day = np.bincount(events.unit[read], weights=events.which[read], minlength=len(events.units))
    seen = np.flatnonzero(n_readings > 0)
    order = seen[np.argsort(mean_day[seen] / n_readings[seen], kind="stable")]
    stretches = np.array_split(order, STRETCHES)
    sizes = [count // STRETCHES + (k < count % STRETCHES) for k in range(STRETCHES)]
    return np.sort(np.concatenate([_middle(own, size) for own, size in zip(stretches, sizes, strict=True)]))


def _middle(units: Integers, count: int) -> Integers:
    start = max(0, (len(units) - count) // 2)
    return units[start : start + count]


def take_units(events: Events, units: Integers) -> Events:
    """The same lab with these units alone; `units` (n,) in rising order."""
    place = np.full(len(events.units), -1)
    place[units] = np.arange(len(units))
    rows = place[events.unit] >= 0
    return Events(
        unit=place[events.unit[rows]],
        kind=events.kind[rows],
        which=events.which[rows],
        amount=events.amount[rows],
        se=events.se[rows],
        units=tuple(events.units[u] for u in units),
        settings=events.settings,
        renewals=events.renewals,
        days=events.days,
        groups={name: tuple(values[u] for u in units) for name, values in events.groups.items()},
    )
