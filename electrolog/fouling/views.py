"""The shared effects of a kept fit as new events see them: every unit without its own old contribution."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from electrolog.fouling.batches import Batch
from electrolog.fouling.covariance import Covariance, between, extended
from electrolog.fouling.effects import Effects
from electrolog.fouling.events import READING, Events
from electrolog.fouling.fit import Component, KeptUnits
from electrolog.fouling.parameters import read_scales
from electrolog.fouling.shapes.shape import Shape

Floats = NDArray[np.float64]
Integers = NDArray[np.int64]


@dataclass(frozen=True)
class View:
    """Components of one shape, their K draws one after the other, with effects for names that the fit didn't know."""

    parts: tuple[Component, ...]
    effects: Effects
    n_known: int  # effects of the fit; the new ones stand behind them
    mean_draws: Floats  # (K, F + 1)
    covariances: tuple[Covariance, ...]
    owner: Integers  # (K,) the part of each draw
    slices: tuple[slice, ...]  # of each part's draws

    @property
    def shape(self) -> Shape:
        return self.parts[0].layout.shape

    @property
    def at_peak(self) -> bool:
        """Whether every part has one draw only, which then stands at its peak."""
        return len(self.owner) == len(self.parts)

    def old_columns(self, columns: Integers) -> Integers:
        """The fit's own columns here: "none" stands behind the new ones."""
        return np.where(columns == self.n_known, len(self.effects.names), columns)


@dataclass(frozen=True)
class Cavity:
    """What each unit's rows, and last its level, see of the shared effects: means (B, K, R + 1), covariances
    (B, K, R + 1, R + 1)."""

    means: Floats
    joint: Floats

    def at_peaks(self, view: View) -> Cavity:
        if view.at_peak:
            return self
        firsts = [mine.start for mine in view.slices]
        means = np.stack([self.means[:, mine].mean(axis=1) for mine in view.slices], axis=1)
        return Cavity(means, self.joint[:, firsts])

    def of_rows(self) -> tuple[Floats, Floats]:
        """(B K, R) and (B K, R, R)."""
        return _pairs(self.means[..., :-1]), _pairs(self.joint[..., :-1, :-1])

    def of_level(self) -> tuple[Floats, Floats]:
        """Mean (B K,) of each unit's expected level, and its covariance with every row and itself (B K, R + 1)."""
        return _pairs(self.means[..., -1]), _pairs(self.joint[..., -1, :])


def _pairs(values: Floats) -> Floats:
    return values.reshape(-1, *values.shape[2:])


def widen(parts: tuple[Component, ...], events: Events) -> View:
    names = parts[0].effects.names
    groups, days = new_names(parts[0], events)
    new = [name for names_of_one in groups for name in names_of_one] + days
    n, more = len(names), len(new)
    slots = np.concatenate([parts[0].effects.variance_slot, np.full(more, -1)])
    effects = Effects(names + tuple(new), np.zeros(n + more), np.zeros(n + more), slots)
    draws = np.concatenate([part.mean_draws for part in parts])
    counts = np.array([len(part.theta_draws) for part in parts])
    ends = np.cumsum(counts)
    return View(
        parts,
        effects,
        n,
        np.concatenate([draws, np.zeros((len(draws), more + 1))], axis=1),
        tuple(extended(part.covariance, new_variances(part, groups, days)) for part in parts),
        np.repeat(np.arange(len(parts)), counts),
        tuple(slice(int(end - count), int(end)) for end, count in zip(ends, counts, strict=True)),
    )


def new_names(part: Component, events: Events) -> tuple[list[list[tuple[str, ...]]], list[tuple[str, ...]]]:
    """Effects that the fit never saw: of each factor's values, and of days."""
    known = set(part.effects.names)
    groups: list[list[tuple[str, ...]]] = [
        sorted({(what, factor, value) for value in events.groups.get(factor, ()) if value} - known)
        for what, factor in part.layout.group_sds
    ]
    days: set[tuple[str, ...]] = {("day", events.days[d]) for d in events.which[events.kind == READING]}
    return groups, sorted(days - known)


def new_variances(part: Component, groups: list[list[tuple[str, ...]]], days: list[tuple[str, ...]]) -> Floats:
    scales = read_scales(part.layout, part.theta)
    of_groups = np.repeat(scales.group_sds**2, [len(names) for names in groups])
    return np.concatenate([of_groups, np.full(len(days), scales.day_sd**2)])


def cavities(view: View, batch: Batch, events: Events) -> Cavity:
    level = np.full((len(batch.unit), 1, batch.columns.shape[2]), len(view.effects.names))
    level[:, 0, : batch.level_columns.shape[1]] = batch.level_columns
    rows = np.concatenate([batch.columns, level], axis=1)
    means = view.mean_draws[:, rows].sum(axis=-1)
    joint = np.stack([between(covariance, rows, rows) for covariance in view.covariances])
    for p, part in enumerate(view.parts):
        for kept in part.units:
            place = {label: k for k, label in enumerate(kept.labels)}
            pairs = [(k, place[events.units[u]]) for k, u in enumerate(batch.unit) if events.units[u] in place]
            if pairs:
                here, there = np.array(pairs).T
                take_out(view, p, (kept, there), rows[here], (means, joint), here)
    joint = 0.5 * (joint + joint.swapaxes(-1, -2))
    return Cavity(means.swapaxes(0, 1), joint[view.owner].swapaxes(0, 1))


def take_out(
    view: View,
    p: int,
    stood_in: tuple[KeptUnits, Integers],
    rows: Integers,
    found: tuple[Floats, Floats],
    here: Integers,
) -> None:
    """Units' own old contributions to part p, out of the means (K, B, R + 1) and covariances (parts, B, R + 1, R + 1)
    that were found, at places `here`."""
    (kept, there), (means, joint), mine = stood_in, found, view.slices[p]
    old = view.old_columns(kept.columns[there])
    cross, own = between(view.covariances[p], rows, old), between(view.covariances[p], old, old)
    precision = kept.precision[there]
    gain = cross @ np.linalg.inv(np.eye(own.shape[1]) - precision @ own)
    joint[p, here] += gain @ precision @ cross.transpose(0, 2, 1)
    seen = view.mean_draws[mine][:, old].sum(axis=-1)
    pull = np.einsum("bij,kbj->kbi", precision, seen) - kept.shift[there]
    means[mine, here] += np.einsum("bij,kbj->kbi", gain, pull)
