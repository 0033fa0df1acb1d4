"""The potentials of one scan, from its vertices; which part of it rises and which falls."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from numpy.typing import ArrayLike, NDArray

from electrolog.errors import InputError

Array = NDArray[np.float64]
FEWEST_POINTS = 20


def potentials_v(vertices_v: Sequence[float], points: int) -> Array:
    """(points,) potentials, evenly spaced in time at one scan rate, from the first vertex to the last."""
    corners = np.asarray(vertices_v, dtype=float)
    travelled = np.concatenate([[0.0], np.cumsum(np.abs(np.diff(corners)))])
    if len(corners) < 2 or travelled[-1] == 0:
        raise InputError(f"the potentials {list(vertices_v)} are no sweep; two different ones or more are needed")
    return np.asarray(np.interp(np.linspace(0, travelled[-1], points), travelled, corners))


def checked_potentials(potential_v: ArrayLike, points: int) -> Array:
    potential = np.asarray(potential_v, dtype=float)
    if potential.shape != (points,) or points < FEWEST_POINTS:
        raise InputError(
            f"a scan has {points} points and {potential.size} potentials were given; each point needs one, and a scan "
            f"{FEWEST_POINTS} or more"
        )
    if not np.isfinite(potential).all() or np.ptp(potential) == 0:
        raise InputError("the potentials must be finite numbers that sweep over a range")
    return potential


def rising(potential_v: Array) -> NDArray[np.bool_]:
    """Where the sweep goes to more positive potentials: there things are oxidised."""
    return np.asarray(np.gradient(potential_v) > 0)


def nearest(potential_v: Array, wanted_v: float, *, upwards: bool) -> int:
    """The point of the rising (or falling) part whose potential lies nearest. Raises InputError outside the sweep."""
    low, high = float(potential_v.min()), float(potential_v.max())
    if not low <= wanted_v <= high:
        raise InputError(f"{wanted_v:g} V lies outside the sweep; accepted: {low:g} to {high:g} V")
    part = rising(potential_v) if upwards else np.gradient(potential_v) < 0
    if not part.any():
        raise InputError(f"no part of the sweep goes {'upwards' if upwards else 'downwards'}")
    return int(np.argmin(np.where(part, np.abs(potential_v - wanted_v), np.inf)))
