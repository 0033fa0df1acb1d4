"""Joint draws of units' true sensitivities, and the questions they answer."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from electrolog.fouling.fit import Component
from electrolog.fouling.parameters import read_scales

Floats = NDArray[np.float64]
Integers = NDArray[np.int64]


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

    def renewed(self, method: str) -> Posterior:
        """The same draws, each unit renewed now by a method that the fit knows: only its clock hears of it."""
        return replace(self, strands=tuple(turned_back(strand, method) for strand in self.strands))

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


def turned_back(strand: Strand, method: str) -> Strand:
    layout = strand.component.layout
    undone = read_scales(layout, strand.component.theta_draws).recovery[:, layout.renewals.index(method)]
    return replace(strand, hours_at_end=strand.hours_at_end * (1.0 - undone)[:, None])


def joined(parts: list[Floats]) -> Floats:
    """(U, all draws of all parts); of no unit too, where -1 would have nothing to reckon with."""
    return np.concatenate([part.reshape(len(part), int(np.prod(part.shape[1:]))) for part in parts], axis=1)


def later(strand: Strand, extra_hours: Floats) -> Floats:
    hours = strand.hours_at_end.T + extra_hours @ strand.weight.T
    return -loss_at(strand, hours[:, :, None])


def loss_at(strand: Strand, hours: Floats) -> Floats:
    """hours (U, K, 1) -> (U, K, S)."""
    value = strand.component.layout.shape.loss(hours, strand.latents, strand.shape_parameters[None, :, None, :]).value
    return np.broadcast_to(value, strand.level.shape)
