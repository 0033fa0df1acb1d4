"""The odds of breaking a limit by the run's end, from the joint draws of what is not known.

Everything here takes draws on the last axis, (D,) for one probe or (U, D) for a shelf of them. A run never raises
the sensitivity, so a limit that holds at the run's end held all the way.
"""

from __future__ import annotations

import functools
from collections.abc import Callable, Mapping
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from electrolog.judge.limits import Limits

Array = NDArray[np.float64]
Mask = NDArray[np.bool_]

LONGEST_MIN = 72 * 60  # beyond three days a forecast for one run is of no use at the bench
QUANTILES = (0.05, 0.5, 0.95)


SHARE, LOD, NEEDS = "least-share-left", "highest-detection-limit", "needs"


@dataclass(frozen=True)
class EndLimits:
    """The limits that a forecast can break: those set of SHARE, LOD and NEEDS, and the widest interval."""

    by_rule: Mapping[str, float]
    widest_interval: float | None
    signal_to_noise: float

    @classmethod
    def of(cls, limits: Limits, needs_um: float | None) -> EndLimits:
        asked = {SHARE: limits.value(SHARE), LOD: limits.value(LOD), NEEDS: needs_um}
        set_ones = {rule: value for rule, value in asked.items() if value is not None}
        return cls(set_ones, limits.value("widest-interval"), limits.signal_to_noise())


@dataclass(frozen=True)
class Beside:
    """What the sensitivity is judged beside: draws of the reference's log sensitivity and of the noise (nA)."""

    log_reference: Array | None
    noise_na: Array | None

    def share(self, log_sensitivity: Array) -> Array | None:
        return None if self.log_reference is None else np.exp(log_sensitivity - self.log_reference)

    def lod_um(self, log_sensitivity: Array, signal_to_noise: float) -> Array | None:
        if self.noise_na is None:
            return None
        # A dead probe detects nothing: beyond exp(600) it is said to, rather than that a number overflowed.
        return signal_to_noise * self.noise_na * np.exp(np.minimum(-log_sensitivity, 600.0))


def values_at(log_sensitivity: Array, beside: Beside, ends: EndLimits) -> dict[str, Array]:
    """Per set rule, what it is about; a rule that can't be told (no reference, no noise) is left out."""
    share, lod_um = beside.share(log_sensitivity), beside.lod_um(log_sensitivity, ends.signal_to_noise)
    known = {SHARE: share, LOD: lod_um, NEEDS: lod_um}
    return {rule: value for rule, value in known.items() if value is not None and rule in ends.by_rule}


def breaches(log_sensitivity: Array, beside: Beside, ends: EndLimits) -> dict[str, Mask]:
    """Per set rule that can be told, which draws break it."""
    return {
        rule: value < ends.by_rule[rule] if rule == SHARE else value > ends.by_rule[rule]
        for rule, value in values_at(log_sensitivity, beside, ends).items()
    }


def least_log_sensitivity(beside: Beside, ends: EndLimits) -> Array | None:
    """What the log sensitivity may not fall below, by the strictest limit in each draw; None where none can be told.

    Shapes broadcast: (D,), (U, D), or (U, 1) for a noise that is taken as known. NaN: unknown for that probe.
    """
    found: list[Array] = []
    if SHARE in ends.by_rule and beside.log_reference is not None:
        found.append(beside.log_reference + np.log(ends.by_rule[SHARE]))
    highest_um = min((ends.by_rule[rule] for rule in (LOD, NEEDS) if rule in ends.by_rule), default=None)
    if highest_um is not None and beside.noise_na is not None:
        found.append(np.log(ends.signal_to_noise * beside.noise_na / highest_um))
    return functools.reduce(np.fmax, found) if found else None


def any_breach(log_sensitivity: Array, beside: Beside, ends: EndLimits) -> Mask:
    """A probe that breaks two limits in the same draw fails once: the odds are of the union, not a sum.

    What can't be told (None, or NaN for one probe of a shelf) breaks nothing here; who asks names it.
    """
    return below(log_sensitivity, least_log_sensitivity(beside, ends))


def below(log_sensitivity: Array, least: Array | None) -> Mask:
    return np.zeros(log_sensitivity.shape, dtype=bool) if least is None else np.asarray(log_sensitivity < least)


def relative_width(log_sensitivity: Array) -> Array:
    """Width of the central 90 % interval of the sensitivity as a share of its median."""
    low, middle, high = np.quantile(log_sensitivity, QUANTILES, axis=-1)
    return np.asarray(np.exp(np.minimum(high - middle, 600.0)) - np.exp(low - middle))


def holds(log_sensitivity: Array, beside: Beside, ends: EndLimits, accepted_risk: float) -> Mask:
    """Whether the odds stay within the accepted risk, and the interval within its limit."""
    within = any_breach(log_sensitivity, beside, ends).mean(axis=-1) <= accepted_risk
    if ends.widest_interval is None:
        return np.asarray(within)
    return np.asarray(within & (relative_width(log_sensitivity) <= ends.widest_interval))


def longest_run_min(holds_at: Callable[[NDArray[np.int64]], Mask], count: int, most_min: int = LONGEST_MIN) -> Array:
    """(count,) the longest runs in whole minutes that hold; 0 where none does, `most_min` where that long a one does.

    holds_at: (count,) whole minutes -> (count,) bool; once it fails it fails for every longer run.
    """
    low, high = np.zeros(count, dtype=np.int64), np.full(count, most_min, dtype=np.int64)
    all_the_way = holds_at(high)
    low[all_the_way] = most_min
    while np.any(high - low > 1):
        middle = (low + high) // 2
        good = holds_at(middle)
        low, high = np.where(good, np.maximum(low, middle), low), np.where(good, high, middle)
        high = np.maximum(high, low)
    return low.astype(float)


def spread(values: Array) -> tuple[float, float, float]:
    """The 5, 50 and 95 % quantiles of one probe's draws."""
    low, middle, high = (float(value) for value in np.quantile(values, QUANTILES))
    return low, middle, high
