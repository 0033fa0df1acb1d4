"""A flow-cell recording: drift taken off, each injection's plateau, its noise, how fast it rose and how it tails."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from electrolog.errors import DataError, InputError
from electrolog.measure.drift import Drift, fitted_drift, scatter_about_line
from electrolog.measure.injections import EDGE_S, find_injections, given_injections
from electrolog.measure.recording import (
    NEGATIVE,
    Span,
    checked_clock,
    checked_current,
    clipped,
    gaps,
    said_of_gaps,
    spans_of,
)

Array = NDArray[np.float64]

UNSETTLED_SHARE = 0.05  # common practice: a plateau that still moves by 5 % isn't one
LONG_TAIL = 3.0  # how many times longer than the rise a fall may last before it is remarked on


@dataclass(frozen=True)
class TraceSettings:
    """What a person may set by hand. None: found from the recording.

    plateau: from which to which share of an injection's length its level is taken. baseline_degree: of the
    polynomial through the stretches at rest. turned: the recording's sign is reversed before anything else.
    """

    injections: tuple[Span, ...] | None = None
    baseline_degree: int = 2
    plateau: tuple[float, float] = (0.5, 0.95)
    edge_s: float = EDGE_S
    turned: bool = False

    def __post_init__(self) -> None:
        low, high = self.plateau
        if not 0 <= low < high <= 1:
            raise InputError(f"plateau: {low:g} to {high:g} is no stretch of an injection; accepted: such as 0.5-0.95")
        if not 0 <= self.baseline_degree <= 5:
            raise InputError(f"baseline: degree {self.baseline_degree} is out of range; accepted: 0 to 5")


@dataclass(frozen=True)
class Plateau:
    """One injection. `moves_na`: from the first to the last third of the plateau.

    `rise_s`: 10 to 90 %; `fall_s`: 90 to 10 %. None: not seen before the next one began.
    """

    injection: Span
    window: Span
    level_na: float
    noise_na: float
    moves_na: float
    rise_s: float | None
    fall_s: float | None

    @property
    def tailing(self) -> float | None:
        """How many times longer the fall lasts than the rise: above one where the analyte clings to the carbon."""
        return self.fall_s / self.rise_s if self.fall_s and self.rise_s else None


@dataclass(frozen=True)
class TraceReading:
    """`corrected_na` (n,) has the drift taken off and the sign turned, if it was; `noise_na` is that at rest."""

    time_s: Array
    corrected_na: Array
    drift: Drift
    plateaus: tuple[Plateau, ...]
    noise_na: float
    settings: TraceSettings
    warnings: tuple[str, ...]

    def points(self, concentration_um: Sequence[float]) -> tuple[tuple[float, float], ...]:
        """(µM, nA) of each injection in order; a repeated concentration is a replicate. Raises InputError."""
        return paired_points(concentration_um, [one.level_na for one in self.plateaus])


def read_trace(time_s: ArrayLike, current_na: ArrayLike, settings: TraceSettings | None = None) -> TraceReading:
    """Times and currents (n,). Raises InputError or DataError for what is no recording of injections."""
    settings = settings or TraceSettings()
    time = checked_clock(time_s)
    current = checked_current(current_na, len(time))
    held = spans_of(clipped(current), time)
    current = -current if settings.turned else current
    injections, found = injections_of(time, current, settings)
    drift = fitted_drift(time, current, injections, settings.baseline_degree)
    corrected = current - drift.at(time)
    plateaus = tuple(_plateau(time, corrected, place, injections, settings) for place in range(len(injections)))
    said = [*said_of_gaps(gaps(time)), *found]
    said += [text for place, one in enumerate(plateaus, 1) for text in _said_of(one, place, time, held)]
    return TraceReading(time, corrected, drift, plateaus, drift.noise_na, settings, tuple(said))


def injections_of(time: Array, current: Array, settings: TraceSettings) -> tuple[tuple[Span, ...], list[str]]:
    if settings.injections is not None:
        return given_injections(settings.injections, time), []
    found = find_injections(time, current, settings.edge_s)
    said = list(found.warnings)
    if found.downward:
        said.append(f"the current falls at every injection: {NEGATIVE} Nothing was turned")
    return found.injections, said


def paired_points(concentration_um: Sequence[float], level_na: Sequence[float]) -> tuple[tuple[float, float], ...]:
    if len(concentration_um) != len(level_na):
        raise InputError(
            f"{len(level_na)} injections stand in the recording and {len(concentration_um)} concentrations were given",
            "look at the picture (--figure); give the injections as a table where they were found wrongly",
        )
    return tuple(zip(map(float, concentration_um), level_na, strict=True))


def plateau_window(injection: Span, share: tuple[float, float]) -> Span:
    low, high = (injection.start_s + part * injection.length_s for part in share)
    return Span(low, high)


def said_of_window(window: Span, place: int, time: Array, held: Sequence[Span]) -> list[str]:
    """What disturbs one injection's plateau: a pause of the clock, or an amplifier at its limit."""
    said = []
    if any(gap.touches(window) for gap in gaps(time)):
        said.append(f"injection {place}: the recording has a gap within its plateau")
    if any(window.start_s <= span.end_s and span.start_s <= window.end_s for span in held):
        said.append(
            f"injection {place}: the signal stands at its very extreme: the amplifier was at its limit, and the "
            "true current lies beyond"
        )
    return said


def _plateau(time: Array, corrected: Array, place: int, injections: Sequence[Span], settings: TraceSettings) -> Plateau:
    injection = injections[place]
    window = plateau_window(injection, settings.plateau)
    here = window.within(time)
    if here.sum() < 3:
        raise DataError(f"injection {place + 1} has {int(here.sum())} samples on its plateau; three or more are needed")
    level, noise = float(corrected[here].mean()), scatter_about_line(time[here], corrected[here])
    until = injections[place + 1].start_s if place + 1 < len(injections) else float(time[-1])
    share = _smooth(corrected, time) / level if level else np.zeros_like(corrected)
    rise = _between(time, share, injection.start_s - settings.edge_s, injection.end_s, 0.1, 0.9)
    fall = _between(time, 1 - share, window.end_s, until, 0.1, 0.9)
    third = np.array_split(corrected[here], 3)
    return Plateau(injection, window, level, noise, float(third[2].mean() - third[0].mean()), rise, fall)


def _smooth(current: Array, time: Array) -> Array:
    """Over a third of a second: shorter than any flow cell's rise, longer than the noise."""
    size = max(1, min(301, round(0.3 / float(np.median(np.diff(time))))))
    return current if size < 2 else np.convolve(current, np.full(size, 1 / size), mode="same")


def _between(time: Array, share: Array, start_s: float, end_s: float, low: float, high: float) -> float | None:
    """Seconds from the first passing of `low` to the first of `high` after it; None too where a gap hides them."""
    here = (time >= start_s) & (time <= end_s)
    clock, part = time[here], share[here]
    above = np.flatnonzero(part >= high)
    if not above.size or above[0] == 0:
        return None
    below = np.flatnonzero(part[: above[0]] <= low)
    if not below.size:
        return None
    way = Span(_crossing(clock, part, int(below[-1]), low), _crossing(clock, part, int(above[0]) - 1, high))
    return None if any(gap.touches(way) for gap in gaps(time)) else way.length_s


def _crossing(clock: Array, part: Array, before: int, level: float) -> float:
    step = part[before + 1] - part[before]
    inside = 0.0 if step == 0 else min(1.0, max(0.0, float((level - part[before]) / step)))
    return float(clock[before] + inside * (clock[before + 1] - clock[before]))


def _said_of(one: Plateau, place: int, time: Array, held: Sequence[Span]) -> list[str]:
    said = said_of_window(one.window, place, time, held)
    if abs(one.moves_na) > max(UNSETTLED_SHARE * abs(one.level_na), 3 * one.noise_na):
        said.append(f"injection {place}: no plateau yet, the current still moves by {one.moves_na:.2g} nA on it")
    if any("at its limit" in text for text in said):
        return said  # how fast a cut-off signal rose and fell can't be said
    if one.fall_s is None:
        said.append(f"injection {place}: the current isn't seen to come back to a tenth before the recording goes on")
    elif one.tailing is not None and one.tailing > LONG_TAIL:
        said.append(
            f"injection {place}: the fall lasts {one.tailing:.2g} times the rise ({one.fall_s:.2g} s, {one.rise_s:.2g} "
            "s): the analyte clings to the carbon"
        )
    return said
