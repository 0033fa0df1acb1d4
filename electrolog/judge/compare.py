"""Do groups of probes differ: in level, rate of loss, share left, yield, survival? With intervals and how sure.

Every pair of groups is compared in every measure that is given. Asking often enough finds something by chance, so
the p-values of one call are adjusted together (S. Holm, Scand. J. Stat. 6 (1979) 65); the intervals are of one
comparison each, 95 %.
"""

from __future__ import annotations

import itertools
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass, field, replace
from typing import Any

import numpy as np
from numpy.typing import ArrayLike, NDArray

from electrolog.errors import InputError
from electrolog.judge import power
from electrolog.judge.scores import share_interval
from electrolog.judge.survival import log_rank, survival

Array = NDArray[np.float64]
Lives = Mapping[str, tuple[ArrayLike, ArrayLike]]

SURE = 0.05


@dataclass(frozen=True)
class Estimate:
    """One group in one measure, with a 95 % interval (None: one probe alone doesn't tell its group's spread).

    value: the mean, the geometric mean where the measure is a ratio scale, the share, or the median life.
    """

    measure: str
    group: str
    count: int
    value: float | None
    low: float | None
    high: float | None


@dataclass(frozen=True)
class Difference:
    """first against second: their ratio (`as_ratio`) or difference, with a 95 % interval.

    p is of this comparison alone, p_holm adjusted for all of the call. more_probes: how many more per group a clear
    answer would take (80 % power at 5 %), for the difference that `power_for` names; 0: they suffice. None: can't be
    told, or no number would do.
    """

    measure: str
    first: str
    second: str
    as_ratio: bool
    value: float | None
    low: float | None
    high: float | None
    p: float | None
    test: str
    more_probes: int | None = None
    power_for: str = ""
    p_holm: float | None = None

    @property
    def clear(self) -> bool:
        return self.p_holm is not None and self.p_holm < SURE


@dataclass(frozen=True)
class Groups:
    """What is known of each group. values: per measure, per group, one number per probe (n,), such as its level or its
    loss per hour; those named in ratio_measures are compared as ratios and must be positive. shares: per measure, per
    group, (how many, of how many), such as the yield. lives: per group, (hours (n,), retired (n,)).
    matters: per measure, the least difference (or ratio) worth knowing; by default the one that was seen.
    """

    values: Mapping[str, Mapping[str, ArrayLike]] = field(default_factory=dict)
    ratio_measures: Sequence[str] = ()
    shares: Mapping[str, Mapping[str, tuple[int, int]]] = field(default_factory=dict)
    lives: Lives = field(default_factory=dict)
    matters: Mapping[str, float] = field(default_factory=dict)


@dataclass(frozen=True)
class Comparison:
    estimates: tuple[Estimate, ...]
    differences: tuple[Difference, ...]
    said: str


def compare(groups: Groups) -> Comparison:
    """Raises InputError for a value that is no number, or not positive in a ratio measure."""
    estimates: list[Estimate] = []
    differences: list[Difference] = []
    for measure, by_group in groups.values.items():
        as_ratio = measure in groups.ratio_measures
        known = {group: _checked(measure, group, values, as_ratio) for group, values in by_group.items()}
        estimates += [_mean(measure, group, values, as_ratio) for group, values in known.items()]
        differences += [_of_means(measure, pair, as_ratio, groups.matters.get(measure)) for pair in _pairs(known)]
    for measure, counts in groups.shares.items():
        estimates += [_share(measure, group, *count) for group, count in counts.items()]
        differences += [_of_shares(measure, pair, groups.matters.get(measure)) for pair in _pairs(counts)]
    estimates += [_life(group, *pair) for group, pair in groups.lives.items()]
    differences += [_of_lives(pair, groups.matters.get("survival")) for pair in _pairs(groups.lives)]
    adjusted = _with_holm(differences)
    tested = sum(difference.p is not None for difference in adjusted)
    said = f"{tested} comparisons, p-values adjusted together by Holm's method; intervals are 95 %, one comparison each"
    return Comparison(tuple(estimates), adjusted, said)


def _checked(measure: str, group: str, values: ArrayLike, as_ratio: bool) -> Array:
    known = np.asarray(values, dtype=float)
    if not np.isfinite(known).all() or (as_ratio and (known <= 0).any()):
        wanted = "numbers above zero" if as_ratio else "numbers"
        raise InputError(f"{measure} of group '{group}' has a value that can't be compared; accepted: {wanted}")
    return known


_Pair = tuple[tuple[str, Any], tuple[str, Any]]


def _pairs(groups: Mapping[str, Any]) -> Iterable[_Pair]:
    return itertools.combinations(groups.items(), 2)


def _mean(measure: str, group: str, values: Array, as_ratio: bool) -> Estimate:
    from scipy.special import stdtrit

    scale = np.log(values) if as_ratio else values
    if len(scale) == 0:
        return Estimate(measure, group, 0, None, None, None)
    middle = float(scale.mean())
    if len(scale) == 1:
        return Estimate(measure, group, 1, _back(middle, as_ratio), None, None)
    half = float(stdtrit(len(scale) - 1, 0.975)) * float(scale.std(ddof=1)) / np.sqrt(len(scale))
    low, value, high = (_back(x, as_ratio) for x in (middle - half, middle, middle + half))
    return Estimate(measure, group, len(scale), value, low, high)


def _back(value: float, as_ratio: bool) -> float:
    return float(np.exp(value)) if as_ratio else float(value)


def _of_means(measure: str, pair: _Pair, as_ratio: bool, matters: float | None) -> Difference:
    """Welch's test: groups of probes need not scatter alike."""
    (first, a), (second, b) = pair
    a, b = (np.log(a), np.log(b)) if as_ratio else (a, b)
    unknown = Difference(measure, first, second, as_ratio, None, None, None, None, "Welch's t")
    if min(len(a), len(b)) == 0:
        return unknown
    apart = float(a.mean() - b.mean())
    if min(len(a), len(b)) < 2 or a.std() + b.std() == 0:
        return replace(unknown, value=_back(apart, as_ratio))
    from scipy.stats import ttest_ind

    test = ttest_ind(a, b, equal_var=False)
    low, high = test.confidence_interval(0.95)
    sought = apart if matters is None else float(np.log(matters)) if as_ratio else matters
    sd = float(np.sqrt((a.var(ddof=1) + b.var(ddof=1)) / 2))
    return replace(
        unknown,
        value=_back(apart, as_ratio),
        low=_back(low, as_ratio),
        high=_back(high, as_ratio),
        p=float(test.pvalue),
        more_probes=power.more(power.probes_for_mean(abs(sought) / sd), min(len(a), len(b))),
        power_for=_power_for(matters),
    )


def _power_for(matters: float | None) -> str:
    return "the difference that was seen" if matters is None else f"a difference of {matters:g}"


def _share(measure: str, group: str, found: int, of: int) -> Estimate:
    low, high = share_interval(found, of)
    return Estimate(measure, group, of, found / of if of else None, low, high)


def _of_shares(measure: str, pair: _Pair, matters: float | None) -> Difference:
    """Fisher's exact test; the interval is the hybrid of Wilson's two (Newcombe, Stat. Med. 17 (1998) 873)."""
    from scipy.stats import fisher_exact

    (first, (found_a, of_a)), (second, (found_b, of_b)) = pair
    if 0 in (of_a, of_b):
        return Difference(measure, first, second, False, None, None, None, None, "Fisher's exact")
    a, b = found_a / of_a, found_b / of_b
    (low_a, high_a), (low_b, high_b) = share_interval(found_a, of_a), share_interval(found_b, of_b)
    table = np.array([[found_a, of_a - found_a], [found_b, of_b - found_b]])
    needed = power.probes_for_shares(b, a if matters is None else min(1.0, b + matters))
    return Difference(
        measure,
        first,
        second,
        False,
        a - b,
        float(a - b - np.hypot(a - low_a, high_b - b)),
        float(a - b + np.hypot(high_a - a, b - low_b)),
        float(fisher_exact(table)[1]),
        "Fisher's exact",
        power.more(needed, min(of_a, of_b)),
        _power_for(matters),
    )


def _life(group: str, time: ArrayLike, lost: ArrayLike) -> Estimate:
    curve = survival(time, lost)
    count = int(np.size(time))
    return Estimate("survival", group, count, curve.median, curve.median_low, curve.median_high)


def _of_lives(pair: _Pair, matters: float | None) -> Difference:
    """Log-rank; the ratio of the rates of retirement is exp((O − E)/V) (Peto et al., Br. J. Cancer 35 (1977) 1)."""
    (first, a), (second, b) = pair
    test = log_rank([a, b])
    apart = float(test.observed[0] - test.expected[0])
    unknown = Difference("survival", first, second, True, None, None, None, None, "log-rank")
    if test.chi_square <= 0 or apart == 0:
        return unknown
    variance = apart**2 / test.chi_square
    half = 1.96 / np.sqrt(variance)
    seen = apart / variance
    needed = power.losses_for_lives(seen if matters is None else float(np.log(matters)))
    lost = float(test.observed.sum())
    more = None if needed is None else max(0.0, needed - lost) / lost * min(np.size(a[0]), np.size(b[0]))
    return replace(
        unknown,
        value=float(np.exp(seen)),
        low=float(np.exp(seen - half)),
        high=float(np.exp(seen + half)),
        p=test.p,
        more_probes=None if more is None else int(np.ceil(more)),
        power_for=_power_for(matters),
    )


def _with_holm(differences: Sequence[Difference]) -> tuple[Difference, ...]:
    tested = [difference.p for difference in differences if difference.p is not None]
    adjusted = iter(holm(tested))
    return tuple(
        difference if difference.p is None else replace(difference, p_holm=float(next(adjusted)))
        for difference in differences
    )


def holm(p_values: Sequence[float]) -> Array:
    """(k,) adjusted: the smallest times k, the next times k − 1, …, never falling, never above 1."""
    p = np.asarray(p_values, dtype=float)
    order = np.argsort(p)
    steps = np.maximum.accumulate(p[order] * (len(p) - np.arange(len(p))))
    adjusted = np.empty(len(p))
    adjusted[order] = np.minimum(steps, 1.0)
    return adjusted
