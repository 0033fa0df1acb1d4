"""How much each point of a calibration counts: weights proportional to 1/variance, with mean one."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike, NDArray

from electrolog.errors import DataError, InputError
from electrolog.measure.line import levels_um
from electrolog.measure.schemes import EQUAL, error_model, scheme

Array = NDArray[np.float64]


def by_scheme(named: str, concentration_um: ArrayLike, current_na: ArrayLike) -> Array | None:
    """Weights (n,) of the points by a scheme's name; None for equal ones. Raises DataError where they can't be had."""
    chosen = scheme(named)
    if chosen == EQUAL:
        return None
    if chosen in ("1/x", "1/x2"):
        return from_concentration(concentration_um, 1 if chosen == "1/x" else 2)
    if chosen == "replicates":
        return from_replicates(concentration_um, current_na)
    return from_error_model(current_na, *error_model(chosen))


def from_concentration(concentration_um: ArrayLike, power: int) -> Array:
    """1/x (power 1: variance grows as the concentration) or 1/x² (power 2: a constant relative scatter).

    A blank would get infinite weight; it gets that of the lowest concentration above zero.
    """
    x = np.asarray(concentration_um, dtype=float)
    if not (x > 0).any():
        raise DataError("weights by concentration need a concentration above zero; there is none")
    return _mean_one(1 / np.maximum(x, x[x > 0].min()) ** power)


def from_sd(current_sd_na: ArrayLike) -> Array:
    """1/sd² of each point's known standard deviation."""
    sd = np.asarray(current_sd_na, dtype=float)
    if not (np.isfinite(sd).all() and (sd > 0).all()):
        raise InputError("each point's standard deviation must be above zero to weigh it")
    return _mean_one(1 / sd**2)


def from_error_model(current_na: ArrayLike, noise_na: float, relative_sd: float) -> Array:
    """A stated error model: variance = noise² + (relative_sd · current)²."""
    y = np.asarray(current_na, dtype=float)
    return from_sd(np.sqrt(noise_na**2 + (relative_sd * y) ** 2))


def from_replicates(concentration_um: ArrayLike, current_na: ArrayLike) -> Array:
    """1/s² of each concentration's replicates; every concentration needs two that differ."""
    x, y = np.asarray(concentration_um, dtype=float), np.asarray(current_na, dtype=float)
    sd = np.full(len(x), np.nan)
    for level_um in levels_um(x):
        here = x == level_um
        sd[here] = y[here].std(ddof=1) if here.sum() > 1 else np.nan
    if not (sd > 0).all():
        lone_um = x[~(sd > 0)][0]
        raise DataError(
            f"the replicates at {lone_um:g} µM can't give a weight: fewer than two, or all alike",
            "use equal weights, 1/x or 1/x², or state an error model",
        )
    return from_sd(sd)


def _mean_one(weights: Array) -> Array:
    return np.asarray(weights * (weights.size / weights.sum()))
