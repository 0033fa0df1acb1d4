"""A sheet of scans, potential by time: where the analyte shows, its voltammograms, peaks, background and noise."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field

import numpy as np
from numpy.typing import ArrayLike, NDArray

from electrolog.errors import InputError
from electrolog.measure.drift import scatter_about_line
from electrolog.measure.injections import contrast_over
from electrolog.measure.peaks import Peaks, peaks_of, smoothed
from electrolog.measure.recording import Span, gaps, said_of_gaps, step_s
from electrolog.measure.scan_sheet import ScanSheet, around, clock_of, column, first_pass, held_at_limit, mean_scan
from electrolog.measure.sweep import checked_potentials, nearest, rising
from electrolog.measure.trace import (
    TraceSettings,
    injections_of,
    paired_points,
    plateau_window,
    said_of_window,
)

Array = NDArray[np.float64]

LIKELY = 20  # points of a scan: the medians of all would take as long as reading the sheet
BACKGROUND_S = (5.0, 0.5)  # common practice: the seconds right before an injection


@dataclass(frozen=True)
class ScanSettings:
    """What a person may set by hand; None: found.

    background_s: from how long to how long before an injection its background is taken. drifting: the background
    is carried on in a straight line to the one before the next injection. oxidation_v also says at
    which potential injections are looked for and points are taken; charging_v, at which the background current is
    stated (default: where the oxidation peak stands).
    """

    trace: TraceSettings = field(default_factory=TraceSettings)
    background_s: tuple[float, float] = BACKGROUND_S
    drifting: bool = True
    oxidation_v: float | None = None
    reduction_v: float | None = None
    charging_v: float | None = None

    def __post_init__(self) -> None:
        if not self.background_s[0] > self.background_s[1] >= 0:
            raise InputError(
                f"background: {self.background_s[0]:g} to {self.background_s[1]:g} s before an injection is no "
                "stretch; accepted: such as 5-0.5"
            )


@dataclass(frozen=True)
class Voltammogram:
    """One injection's: the mean scan on its plateau less the background's, (points,)."""

    injection: Span
    window: Span
    background: Span
    current_na: Array
    level_na: float
    peaks: Peaks


@dataclass(frozen=True)
class ScanReading:
    """`trace_na` (scans,) is the current at `trace_v`, where the points are taken. `background_na` (points,) is the
    first injection's; `charging_na` is its current at `charging_v`. `noise_na`: of a single scan at `trace_v`."""

    time_s: Array
    potential_v: Array
    trace_na: Array
    trace_v: float
    voltammograms: tuple[Voltammogram, ...]
    background_na: Array
    charging_v: float
    charging_na: float
    noise_na: float
    settings: ScanSettings
    warnings: tuple[str, ...]

    @property
    def peaks(self) -> Peaks:
        """Those of the largest response, where noise shifts them least."""
        return max(self.voltammograms, key=lambda one: abs(one.level_na)).peaks

    def points(self, concentration_um: Sequence[float]) -> tuple[tuple[float, float], ...]:
        return paired_points(concentration_um, [one.level_na for one in self.voltammograms])


def read_scans(
    sheet: ScanSheet, potential_v: ArrayLike, time_s: ArrayLike, settings: ScanSettings | None = None
) -> ScanReading:
    """sheet (scans, points), potential_v (points,), time_s (scans,). Raises InputError or DataError."""
    settings = settings or ScanSettings()
    time = clock_of(sheet, time_s)
    potential = checked_potentials(potential_v, sheet.shape[1])
    block = max(1, round(settings.trace.edge_s / 4 / step_s(time)))
    coarse, reach = first_pass(sheet, block)
    sign = -1.0 if settings.trace.turned else 1.0
    at = _where_it_shows(sign * coarse, potential, settings.oxidation_v)
    trace = sign * column(sheet, at)
    injections, found = injections_of(time, trace, settings.trace)
    backgrounds = _backgrounds(sheet, time, injections, settings)
    responses = [
        sign * (mean_scan(sheet, time, window) - background)
        for window, background in zip(_windows(injections, settings), backgrounds, strict=True)
    ]
    smooth = smoothed(np.array(responses))
    at = _at_the_peak(potential, responses, smooth, at, settings)
    trace = sign * column(sheet, at)
    noise = _noise(time, trace, injections, settings)
    graphs = tuple(
        _voltammogram(time, potential, one, (response, own), at, noise, settings)
        for one, response, own in zip(injections, responses, smooth, strict=True)
    )
    background = sign * backgrounds[0]
    charging_at = at if settings.charging_v is None else nearest(potential, settings.charging_v, upwards=True)
    return ScanReading(
        time_s=time,
        potential_v=potential,
        trace_na=trace,
        trace_v=float(potential[at]),
        voltammograms=graphs,
        background_na=background,
        charging_v=float(potential[charging_at]),
        charging_na=around(background, charging_at),
        noise_na=noise,
        settings=settings,
        warnings=(*said_of_gaps(gaps(time)), *found, *_said_of(graphs, time, held_at_limit(sheet, reach, time))),
    )


def response_map(sheet: ScanSheet, reading: ScanReading, most_columns: int = 1200) -> tuple[Array, Array]:
    """For a picture: (scans', points) less the first background, scans averaged down to `most_columns`; their times."""
    block = max(1, sheet.shape[0] // most_columns)
    coarse, _ = first_pass(sheet, block)
    sign = -1.0 if reading.settings.trace.turned else 1.0
    times = reading.time_s[: len(coarse) * block].reshape(-1, block).mean(1)
    return sign * coarse - reading.background_na, times


def _where_it_shows(coarse: Array, potential: Array, named_v: float | None) -> int:
    """The point of the rising sweep whose current steps most from one four seconds to the next."""
    if named_v is not None:
        return nearest(potential, named_v, upwards=True)
    part = rising(potential)
    upwards = np.flatnonzero(part if part.any() else ~part)
    level = coarse[:, upwards]
    step = np.abs(contrast_over(level - level.mean(0), 4))
    highest = step.max(0)

    def clear(columns: NDArray[np.int64]) -> Array:
        return np.asarray(highest[columns] - 3 * np.median(step[:, columns], axis=0))

    least = clear(np.argsort(-highest)[:LIKELY]).max()
    among = np.flatnonzero(highest >= least)  # what drifts can only lower the others
    return int(upwards[among[np.argmax(clear(among))]])


def _at_the_peak(potential: Array, responses: Sequence[Array], smooth: Array, at: int, settings: ScanSettings) -> int:
    """Points of all injections are taken at one potential, that of the largest response's peak.

    Each injection's own highest point would be read too high where the noise chose it.
    """
    if settings.oxidation_v is not None:
        return at
    heights = [around(response, at) for response in responses]
    largest = max(range(len(heights)), key=lambda place: abs(heights[place]))
    upright = smooth[largest] if heights[largest] >= 0 else -smooth[largest]
    peak = peaks_of(potential, upright, 0.0, oxidation_v=None, reduction_v=settings.reduction_v).oxidation
    return at if peak is None else peak.index


def _voltammogram(
    time: Array,
    potential: Array,
    injection: Span,
    response: tuple[Array, Array],
    at: int,
    noise: float,
    settings: ScanSettings,
) -> Voltammogram:
    """response: as it is, and smoothed."""
    window, background = plateau_window(injection, settings.trace.plateau), _before(injection, settings)
    own_noise = noise * sum(1 / int(span.within(time).sum()) for span in (window, background)) ** 0.5
    raw, smooth = response
    named = {"oxidation_v": settings.oxidation_v, "reduction_v": settings.reduction_v}
    peaks = peaks_of(potential, smooth, own_noise, **named)
    return Voltammogram(injection, window, background, raw, around(smooth, at), peaks)


def _before(injection: Span, settings: ScanSettings) -> Span:
    far, near = settings.background_s
    return Span(injection.start_s - far, injection.start_s - near)


def _windows(injections: Sequence[Span], settings: ScanSettings) -> list[Span]:
    return [plateau_window(one, settings.trace.plateau) for one in injections]


def _backgrounds(sheet: ScanSheet, time: Array, injections: Sequence[Span], settings: ScanSettings) -> list[Array]:
    """Each injection's, as it would have been in the middle of its plateau."""
    stretches = [_before(one, settings) for one in injections]
    means = [mean_scan(sheet, time, span) for span in stretches]
    if not settings.drifting:
        return means
    after = _at_the_end(injections[-1], time, settings)
    if after is not None:
        stretches, means = [*stretches, after], [*means, mean_scan(sheet, time, after)]
    found = []
    for place, window in enumerate(_windows(injections, settings)):
        if place + 1 == len(stretches):
            found.append(means[place])
            continue
        here, there = (_middle(span) for span in stretches[place : place + 2])
        share = (_middle(window) - here) / (there - here)
        found.append(means[place] + share * (means[place + 1] - means[place]))
    return found


def _at_the_end(last: Span, time: Array, settings: ScanSettings) -> Span | None:
    """The recording's last seconds, where they are far enough from the last injection to be at rest again."""
    far, near = settings.background_s
    stretch = Span(float(time[-1]) - (far - near), float(time[-1]))
    return stretch if stretch.start_s > last.end_s + 0.5 * last.length_s else None


def _middle(span: Span) -> float:
    return (span.start_s + span.end_s) / 2


def _noise(time: Array, trace: Array, injections: Sequence[Span], settings: ScanSettings) -> float:
    """Of single scans before the injections, each stretch about its own line."""
    found = []
    for one in injections:
        here = _before(one, settings).within(time)
        found.append((scatter_about_line(time[here], trace[here]), int(here.sum()) - 2))
    freedom = sum(count for _, count in found)
    return float((sum(sd**2 * count for sd, count in found) / freedom) ** 0.5)


def _said_of(graphs: Sequence[Voltammogram], time: Array, held: Sequence[Span]) -> list[str]:
    said = [text for place, one in enumerate(graphs, 1) for text in said_of_window(one.window, place, time, held)]
    if max(graphs, key=lambda one: abs(one.level_na)).peaks.oxidation is None:
        said.append(
            "no oxidation peak stands out of the largest response: is the current at this potential the analyte's?"
        )
    return said
