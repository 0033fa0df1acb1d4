"""Effects that units share: the cohort's mean level and latents, group effects on level and rate, and the days.

They are one Gaussian vector psi. A reading of a unit sees a sum of some of its columns, a unit's latent (log rate, log
exponent) sees others; which ones stands here. psi's prior: wide for the means, N(0, sd^2) for group effects; a
day's is a mixture, see days.py.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from electrolog.fouling.events import READING, Events
from electrolog.fouling.parameters import Layout, Scales
from electrolog.fouling.shapes.shape import Shape

Floats = NDArray[np.float64]
Integers = NDArray[np.int64]
LEVEL_MEAN, LEVEL_MEAN_SD = 2.3, 2.5  # log of 10 nA/µM, and 12-fold either way at one sd: wide for any analyte


@dataclass(frozen=True)
class Effects:
    """Columns of psi. `name` per column: (level,), (latent, k), (level | rate, factor, value), (day, name).

    `variance_slot` per column says where its prior variance comes from: -3 a day that saw one unit alone, -2 any
    other day (the priors of days stand in days.py); -1 fixed; g the g-th group sd.
    """

    names: tuple[tuple[str, ...], ...]
    prior_mean: Floats
    fixed_variance: Floats
    variance_slot: Integers

    def prior_variance(self, scales: Scales) -> Floats:
        """(..., F) for scales with leading axes (...); inf for days."""
        if not scales.group_sds.shape[-1]:
            return np.broadcast_to(self.fixed_variance, (*scales.level_sd.shape, len(self.names)))
        of_groups = scales.group_sds[..., np.maximum(self.variance_slot, 0)] ** 2
        return np.where(self.variance_slot < 0, self.fixed_variance, of_groups)

    @property
    def is_day(self) -> NDArray[np.bool_]:
        return np.asarray(self.variance_slot <= -2)

    @property
    def lonely(self) -> NDArray[np.bool_]:
        return np.asarray(self.variance_slot == -3)


def lay_out_effects(shape: Shape, group_sds: tuple[tuple[str, str], ...], events: Events) -> Effects:
    names: list[tuple[str, ...]] = [("level",)]
    means, variances, slots = [LEVEL_MEAN], [LEVEL_MEAN_SD**2], [-1]
    for k, prior in enumerate(shape.latents):
        names.append(("latent", str(k)))
        means.append(prior.mean)
        variances.append(prior.sd**2)
        slots.append(-1)
    for g, (what, factor) in enumerate(group_sds):
        values = sorted(set(events.groups[factor]) - {""})
        names += [(what, factor, value) for value in values]
        slots += [g] * len(values)
        variances += [0.0] * len(values)
    used = np.unique(events.which[events.kind == READING])
    names += [("day", events.days[k]) for k in used]
    slots += [-2 if many else -3 for many in units_per_day(events)[used] > 1]
    variances += [np.inf] * len(used)
    means += [0.0] * (len(names) - len(means))
    return Effects(tuple(names), np.array(means), np.array(variances), np.array(slots))


def units_per_day(events: Events) -> Integers:
    """(days,) how many units were measured on each."""
    read = events.kind == READING
    pairs = np.unique(np.stack([events.which[read], events.unit[read]]), axis=1)
    return np.bincount(pairs[0], minlength=len(events.days))


def informative_groups(shape: Shape, events: Events) -> tuple[tuple[str, str], ...]:
    """Factors with at least two known values: each may move the level, and the rate if the shape has one."""
    factors = [name for name, values in sorted(events.groups.items()) if len(set(values) - {""}) >= 2]
    return tuple((what, f) for f in factors for what in ("level", "rate") if what == "level" or shape.latents)


def columns_of_units(effects: Effects, events: Events, n_latents: int) -> tuple[Integers, Integers]:
    """Columns of psi that each unit's latents (U, q, e) and level (U, e) see; F, one past the last, is no column."""
    place = {name: k for k, name in enumerate(effects.names)}
    none = len(effects.names)
    factors = sorted(events.groups)
    level = [np.zeros(len(events.units), dtype=np.int64)]
    rate = [np.full(len(events.units), place.get(("latent", "0"), none))]
    for factor in factors:
        values = events.groups[factor]
        level.append(np.array([place.get(("level", factor, v), none) for v in values], dtype=np.int64))
        rate.append(np.array([place.get(("rate", factor, v), none) for v in values], dtype=np.int64))
    latents = np.full((len(events.units), n_latents, 1 + len(factors)), none)
    if n_latents:
        latents[:, 0] = np.stack(rate, axis=-1)
    for k in range(1, n_latents):
        latents[:, k, 0] = place[("latent", str(k))]
    return latents, np.stack(level, axis=-1)


def columns_of_days(effects: Effects, days: tuple[str, ...]) -> Integers:
    place = {name: k for k, name in enumerate(effects.names)}
    return np.array([place.get(("day", day), len(effects.names)) for day in days], dtype=np.int64)


def layout_for(shape: Shape, events: Events) -> Layout:
    return Layout(shape, events.settings, events.renewals, informative_groups(shape, events))


__all__ = ["Effects", "Layout", "columns_of_days", "columns_of_units", "lay_out_effects", "layout_for"]
