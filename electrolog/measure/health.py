"""Whether a calibration can be trusted beside the earlier ones: warnings, each with its reason."""

from __future__ import annotations

import math
from collections.abc import Callable, Sequence
from dataclasses import dataclass
from datetime import datetime

import numpy as np
from numpy.typing import ArrayLike

from electrolog.measure.tails import t_quantile, two_sided_p
from electrolog.measure.use_by import past_use_by

# Common practice, all of them; what a lab sets as its own limit goes before.
PEAK_SHIFT_V = 0.05
BACKGROUND_SHARE = 0.2
NOISE_FACTOR = 1.5
TEMPERATURE_C = 3.0


@dataclass(frozen=True)
class Circumstances:
    """What is known of one calibration beside its points. None: unknown, and nothing is said about it."""

    at: datetime
    analyte: str = ""
    medium: str | None = None
    temperature_c: float | None = None
    noise_na: float | None = None
    background_na: float | None = None
    oxidation_peak_v: float | None = None
    reduction_peak_v: float | None = None
    highest_um: float | None = None
    lowest_um: float | None = None
    standard_prepared_at: datetime | None = None
    standard_expires_at: datetime | None = None
    diluent: str | None = None
    standard_analyte: str | None = None


def unhealthy(
    now: Circumstances,
    earlier: Sequence[Circumstances] = (),
    *,
    expected_um: tuple[float, float] | None = None,
    peak_shift_v: float = PEAK_SHIFT_V,
) -> tuple[str, ...]:
    """earlier: the comparable calibrations before, oldest first. expected_um: the signal's lowest and highest."""
    said = (
        past_use_by(now.analyte, now.diluent, now.standard_prepared_at, now.standard_expires_at, now.at),
        other_standard(now.standard_analyte, now.analyte),
        unlike_temperature(now, earlier),
        unlike_medium(now, earlier),
        shifted_peaks(now, earlier, peak_shift_v),
        changed_background(now, earlier),
        noisier(now, earlier),
        range_misses(now, expected_um),
    )
    return tuple(text for text in said if text)


def other_standard(holds: str | None, measured: str) -> str | None:
    if holds is None or not measured or holds == measured:
        return None
    return f"the standard holds {holds}, and {measured} was measured with it: is it the right one?"


def unlike_temperature(now: Circumstances, earlier: Sequence[Circumstances]) -> str | None:
    before = _last(earlier, lambda one: one.temperature_c)
    if now.temperature_c is None or before is None or abs(now.temperature_c - before) <= TEMPERATURE_C:
        return None
    return f"measured at {now.temperature_c:g} °C, the one before at {before:g} °C: sensitivities aren't alike"


def unlike_medium(now: Circumstances, earlier: Sequence[Circumstances]) -> str | None:
    used = {one.medium for one in earlier if one.medium}
    if now.medium is None or not used or now.medium in used:
        return None
    return f"measured in {now.medium}, earlier ones in {', '.join(sorted(used))}: sensitivities may not be alike"


def shifted_peaks(now: Circumstances, earlier: Sequence[Circumstances], most_v: float = PEAK_SHIFT_V) -> str | None:
    """Both peaks alike: the reference electrode. Farther apart: the electron transfer, or a resistance."""
    oxidation_v = _change(now.oxidation_peak_v, _last(earlier, lambda one: one.oxidation_peak_v))
    reduction_v = _change(now.reduction_peak_v, _last(earlier, lambda one: one.reduction_peak_v))
    if oxidation_v is None or reduction_v is None:
        return _one_peak(oxidation_v, reduction_v, most_v)
    wider_v, alike_v = oxidation_v - reduction_v, (oxidation_v + reduction_v) / 2
    if abs(wider_v) > most_v:
        cause = "slower electron transfer, fouling or resistance" if wider_v > 0 else "a renewed surface, or a slip"
        return f"the peaks lie {abs(wider_v):.3g} V {'farther apart' if wider_v > 0 else 'closer'} than before: {cause}"
    if abs(alike_v) > most_v:
        return f"both peaks shifted alike by {alike_v:+.3g} V: the reference electrode drifted, not the probe"
    return None


def changed_background(now: Circumstances, earlier: Sequence[Circumstances]) -> str | None:
    before = _last(earlier, lambda one: one.background_na)
    if now.background_na is None or not before:
        return None
    share = now.background_na / before - 1
    if abs(share) <= BACKGROUND_SHARE:
        return None
    cause = "a leaking seal or a larger surface" if share > 0 else "a lost surface, a broken tip or fouling"
    return f"the background current changed by {share:+.0%} since the last calibration: {cause}?"


def noisier(now: Circumstances, earlier: Sequence[Circumstances]) -> str | None:
    before = _last(earlier, lambda one: one.noise_na)
    if now.noise_na is None or not before or now.noise_na <= NOISE_FACTOR * before:
        return None
    return f"the noise is {now.noise_na / before:.2g} times that of the last calibration ({now.noise_na:g} nA)"


def range_misses(now: Circumstances, expected_um: tuple[float, float] | None) -> str | None:
    if expected_um is None or now.highest_um is None or now.lowest_um is None:
        return None
    if now.lowest_um <= expected_um[0] and now.highest_um >= expected_um[1]:
        return None
    return (
        f"calibrated from {now.lowest_um:g} to {now.highest_um:g} µM, but a signal of {expected_um[0]:g} to "
        f"{expected_um[1]:g} µM is expected: outside, the line is a guess"
    )


@dataclass(frozen=True)
class SharedShift:
    """The mean shift of all probes of a day with its 95 % interval."""

    mean: float
    low: float
    high: float
    probes: int


def shared_shift(shifts: ArrayLike, level: float = 0.01) -> SharedShift | None:
    """One shift common to three probes or more, all to the same side and beyond what they scatter; else None."""
    shift = np.asarray(shifts, dtype=float)
    count = shift.size
    if count < 3 or not ((shift > 0).all() or (shift < 0).all()):
        return None
    mean, se = float(shift.mean()), float(shift.std(ddof=1)) / math.sqrt(count)
    if se > 0 and two_sided_p(mean / se, count - 1) >= level:
        return None
    half = t_quantile(0.975, count - 1) * se
    return SharedShift(mean, mean - half, mean + half, count)


def day_points_at_the_standard(log_ratio: ArrayLike, what: str) -> str | None:
    """log_ratio (probes,): log of each sensitivity over what was expected of that probe, fouling included.

    what: the standard or rig they share, as it shall be named.
    """
    found = shared_shift(log_ratio)
    if found is None:
        return None
    off, low, high = (math.expm1(value) for value in (found.mean, found.low, found.high))
    return (
        f"all {found.probes} probes measured with {what} read {off:+.1%} against what was expected "
        f"({low:+.1%} to {high:+.1%}): that points at {what}, not at the probes"
    )


def _one_peak(oxidation_v: float | None, reduction_v: float | None, most_v: float) -> str | None:
    shift_v = oxidation_v if oxidation_v is not None else reduction_v
    if shift_v is None or abs(shift_v) <= most_v:
        return None
    which, other = ("oxidation", "reduction") if oxidation_v is not None else ("reduction", "oxidation")
    return (
        f"the {which} peak shifted by {shift_v:+.3g} V; without the {other} peak the reference electrode and the "
        "probe can't be told apart"
    )


def _last(earlier: Sequence[Circumstances], of: Callable[[Circumstances], float | None]) -> float | None:
    return next((value for one in reversed(earlier) if (value := of(one)) is not None), None)


def _change(now: float | None, before: float | None) -> float | None:
    return None if now is None or before is None else now - before
