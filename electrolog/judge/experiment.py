"""The next best experiment: which probe to recalibrate first, which kind of probe to make more of, to learn most."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike

from electrolog.errors import InputError
from electrolog.judge.value import ValueOfCalibration


@dataclass(frozen=True)
class Recalibration:
    probe: str
    saved_runs: float
    chance_fit: float
    narrowing: float


def recalibrate_first(values: Mapping[str, ValueOfCalibration]) -> tuple[Recalibration, ...]:
    """Probes whose recalibration saves most, in wasted runs, the best first; what saves nothing is left out.

    A probe that is surely fit and stands calibrated, or surely broken, saves nothing: whatever it reads, the decision
    stays. One whose calibration no longer stands can't be taken without a new one, so that gains the probe.
    """
    worth = [Recalibration(label, v.saved_runs, v.chance_fit, v.narrowing) for label, v in values.items()]
    return tuple(sorted((one for one in worth if one.saved_runs > 0), key=lambda one: (-one.saved_runs, one.probe)))


@dataclass(frozen=True)
class Making:
    """more: how many to make per group. widest_now, widest_then: the largest standard error of a difference between two
    groups' means, before and after (in the log or unit of the values).
    """

    more: dict[str, int]
    widest_now: float
    widest_then: float


def make_next(groups: Mapping[str, ArrayLike], count: int) -> Making:
    """Where to put `count` more probes so that the least known difference between two groups becomes best known.

    groups: per group, one value per probe (n,), at least one. One by one, each where it narrows the widest difference
    most. A group of one probe is taken to scatter as the others do. Raises InputError for fewer than two groups, none
    with two probes, or a negative count.
    """
    known = {group: np.asarray(values, dtype=float) for group, values in groups.items()}
    if count < 0 or len(known) < 2 or any(not len(values) for values in known.values()):
        raise InputError(
            f"{count} more probes for {len(known)} groups; accepted: two groups or more, each with a probe"
        )
    variances, counts = _variances(known), {group: len(values) for group, values in known.items()}
    before = _widest(variances, counts)
    for _ in range(count):
        best = min(counts, key=lambda group: _squares_with_one_more(variances, counts, group))
        counts[best] += 1
    more = {group: counts[group] - len(values) for group, values in known.items()}
    return Making(more, before, _widest(variances, counts))


def _variances(known: Mapping[str, np.ndarray]) -> dict[str, float]:
    several = [values for values in known.values() if len(values) > 1]
    if not several:
        raise InputError("every group has one probe: how much probes of a kind scatter isn't known; make a second one")
    freedom = sum(len(values) - 1 for values in several)
    pooled = float(sum(((values - values.mean()) ** 2).sum() for values in several)) / freedom
    return {group: float(values.var(ddof=1)) if len(values) > 1 else pooled for group, values in known.items()}


def _squared_errors(variances: Mapping[str, float], counts: Mapping[str, int]) -> list[float]:
    """Of every group's mean, the largest first: the widest difference is that of the first two."""
    return sorted((variances[group] / counts[group] for group in variances), reverse=True)


def _widest(variances: Mapping[str, float], counts: Mapping[str, int]) -> float:
    first, second, *_ = _squared_errors(variances, counts)
    return float(np.sqrt(first + second))


def _squares_with_one_more(variances: Mapping[str, float], counts: Mapping[str, int], group: str) -> list[float]:
    errors = _squared_errors(variances, {**counts, group: counts[group] + 1})
    return [errors[0] + errors[1], *errors]
