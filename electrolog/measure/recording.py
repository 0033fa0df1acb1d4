"""Whether a raw recording can be read at all: its clock, its gaps, an amplifier at its limit."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from electrolog.errors import DataError, InputError

Array = NDArray[np.float64]
Flags = NDArray[np.bool_]

MOST_SAMPLES = 1_000_000_000
MOST_NA, MOST_S = 1e15, 1e15  # a million amperes, thirty million years: beyond lie other bytes read as numbers
FEWEST_SAMPLES = 20
GAP_STEPS = 5.0  # common practice: a pause of more than five samples is a gap
CLIPPED_RUN = 5  # noise doesn't hold a signal at its very extreme for five samples on end


NEGATIVE = "is oxidation recorded as negative?"  # asked by whatever meets such a recording; said once


@dataclass(frozen=True)
class Span:
    """A stretch of a recording, in seconds of its own clock."""

    start_s: float
    end_s: float

    @property
    def length_s(self) -> float:
        return self.end_s - self.start_s

    def touches(self, other: Span) -> bool:
        return self.start_s < other.end_s and other.start_s < self.end_s

    def within(self, time_s: Array) -> Flags:
        return (time_s >= self.start_s) & (time_s <= self.end_s)


def checked_clock(time_s: ArrayLike) -> Array:
    """Times (n,) that only go forwards. Raises InputError naming the first sample that doesn't."""
    time = np.asarray(time_s, dtype=float)
    if time.ndim != 1 or time.size < FEWEST_SAMPLES:
        raise InputError(f"{time.size} samples are no recording; {FEWEST_SAMPLES} or more are needed, in one row")
    refuse_too_many(time.size)
    bad = np.flatnonzero(~(np.abs(time) <= MOST_S))
    if bad.size:
        raise InputError(
            f"the time of sample {bad[0] + 1} is {time[bad[0]]:g} s; accepted: a finite number up to {MOST_S:g}"
        )
    back = np.flatnonzero(np.diff(time) <= 0)
    if back.size:
        at = int(back[0])
        word = "stands still" if time[at + 1] == time[at] else "runs backwards"
        raise InputError(
            f"time {word} at sample {at + 2}: {time[at + 1]:g} s after {time[at]:g} s"
            f"{f', and {back.size - 1} times more' if back.size > 1 else ''}",
            "were two recordings joined? split the file where the clock starts anew",
        )
    return time


def checked_current(current_na: ArrayLike, samples: int) -> Array:
    current = np.asarray(current_na, dtype=float)
    if current.shape != (samples,):
        raise InputError(f"{samples} times and {current.size} currents don't pair up; each sample needs one of both")
    bad = np.flatnonzero(~(np.abs(current) <= MOST_NA))
    if bad.size:
        raise InputError(
            f"the current of sample {bad[0] + 1} is {current[bad[0]]:g} nA"
            f"{f' ({bad.size} such samples)' if bad.size > 1 else ''}; accepted: finite numbers up to {MOST_NA:g}",
            "leave those samples out of the file: a gap is named and borne",
        )
    if current.max() == current.min():
        raise DataError(f"the current is {current[0]:g} nA throughout: nothing was recorded", "is the probe connected?")
    return current


def refuse_too_many(samples: int) -> None:
    if samples > MOST_SAMPLES:
        raise InputError(f"{samples} samples are too many at once; accepted: up to {MOST_SAMPLES}", "split the file")


def step_s(time_s: Array) -> float:
    return float(np.median(np.diff(time_s)))


def gaps(time_s: Array) -> tuple[Span, ...]:
    steps = np.diff(time_s)
    at = np.flatnonzero(steps > GAP_STEPS * np.median(steps))
    return tuple(Span(float(time_s[i]), float(time_s[i + 1])) for i in at)


def clipped(current_na: NDArray[np.floating]) -> Flags:
    """Samples that stand in a run of equal values at the very top or bottom of the recording (n,)."""
    return _in_run(current_na == current_na.max()) | _in_run(current_na == current_na.min())


def spans_of(flags: Flags, time_s: Array) -> tuple[Span, ...]:
    return tuple(Span(float(time_s[first]), float(time_s[last - 1])) for first, last in _runs(flags))


def said_of_gaps(found: tuple[Span, ...]) -> list[str]:
    if not found:
        return []
    longest = max(found, key=lambda gap: gap.length_s)
    many = f" ({len(found)} gaps, the longest)" if len(found) > 1 else ""
    return [f"the recording has a gap of {longest.length_s:.3g} s at {longest.start_s:.4g} s{many}"]


def _in_run(flags: Flags) -> Flags:
    held = np.zeros_like(flags)
    for first, last in _runs(flags):
        held[first:last] = last - first >= CLIPPED_RUN
    return held


def _runs(flags: Flags) -> Iterator[tuple[int, int]]:
    edges = np.flatnonzero(np.diff(np.concatenate([[0], flags.astype(np.int8), [0]])))
    return zip(edges[::2].tolist(), edges[1::2].tolist(), strict=True)


def once_negative(said: Sequence[str]) -> tuple[str, ...]:
    """Of several remarks that a recording is negative the first: trace, points and line each find it for themselves."""
    first = next((text for text in said if NEGATIVE in text), "")
    return tuple(text for text in said if NEGATIVE not in text or text is first)
