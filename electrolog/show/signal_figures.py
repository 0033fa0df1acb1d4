"""Pictures of what was found in a recording."""

from __future__ import annotations

from collections.abc import Sequence
from itertools import pairwise
from pathlib import Path
from typing import TYPE_CHECKING

from electrolog.answers.signals import Recorded
from electrolog.measure.calibrate import CalibrationFigures
from electrolog.measure.recording import Span
from electrolog.measure.scan_sheet import ScanSheet
from electrolog.measure.scans import ScanReading, response_map
from electrolog.measure.trace import TraceReading
from electrolog.show.figures import BLUE, BROWN, INK, LINES, MARKS, QUIET, figure, labelled, legend_above, two_sided
from electrolog.show.line_figure import draw_line
from electrolog.show.terminal import round_ticks
from electrolog.units import shown_concentration, shown_number

if TYPE_CHECKING:
    import numpy as np
    from matplotlib.axes import Axes
    from numpy.typing import NDArray

    Array = NDArray[np.float64]

_MOST_DRAWN = 20_000


def draw(path: Path, recorded: Recorded, figures: CalibrationFigures) -> None:
    """The whole picture of one recording."""
    if isinstance(recorded.reading, TraceReading):
        with figure(path, 10, 4.2) as paper:
            wide, narrow = paper.subplots(1, 2, width_ratios=(2.3, 1))
            draw_trace(wide, recorded.reading, recorded.concentration_um)
            draw_line(narrow, recorded.points, figures)
    else:
        with figure(path, 10, 7.5) as paper:
            (top_left, top_right), (low_left, low_right) = paper.subplots(2, 2, width_ratios=(1.8, 1))
            if recorded.sheet is not None:
                draw_sheet(top_left, recorded.reading, recorded.sheet)
            draw_voltammograms(top_right, recorded.reading, recorded.concentration_um)
            draw_scan_trace(low_left, recorded.reading, recorded.concentration_um)
            draw_line(low_right, recorded.points, figures)


def draw_trace(axes: Axes, reading: TraceReading, concentration_um: Sequence[float] = ()) -> Axes:
    """The recording less its drift, the stretches at rest, each injection and its plateau."""
    _signal(axes, reading.time_s, reading.corrected_na)
    for span in reading.drift.at_rest:
        axes.plot([span.start_s, span.end_s], [0, 0], color=BLUE, linewidth=2, linestyle="--")
    axes.plot([], [], color=BLUE, linewidth=2, linestyle="--", label="at rest, drift taken off")
    levels = [one.level_na for one in reading.plateaus]
    _plateaus(axes, [one.window for one in reading.plateaus], levels)
    _injections(axes, [one.injection for one in reading.plateaus], _clear(levels, reading.noise_na), concentration_um)
    legend_above(axes)
    return labelled(axes, "Recording", "time (s)", "current (nA)")


def draw_scan_trace(axes: Axes, reading: ScanReading, concentration_um: Sequence[float] = ()) -> Axes:
    """The current at the potential where the points are taken, with each injection and its plateau."""
    _signal(axes, reading.time_s, reading.trace_na)
    graphs = reading.voltammograms
    rest = [float(reading.trace_na[one.background.within(reading.time_s)].mean()) for one in graphs]
    for one, level in zip(graphs, rest, strict=True):
        axes.plot([one.background.start_s, one.background.end_s], [level, level], color=BLUE, linewidth=2, ls="--")
    axes.plot([], [], color=BLUE, linewidth=2, linestyle="--", label="background")
    tops = [float(reading.trace_na[one.window.within(reading.time_s)].mean()) for one in graphs]
    _plateaus(axes, [one.window for one in graphs], tops)
    _injections(axes, [one.injection for one in graphs], _clear(tops, reading.noise_na), concentration_um)
    legend_above(axes)
    return labelled(axes, f"Current at {_volts(reading.trace_v)} V", "time (s)", "current (nA)")


def draw_voltammograms(axes: Axes, reading: ScanReading, concentration_um: Sequence[float] = ()) -> Axes:
    """Every injection's, background taken off, with the peaks of the largest."""
    names = [shown_concentration(value) for value in concentration_um] or [""] * len(reading.voltammograms)
    shades = two_sided()
    largest = max(abs(one.level_na) for one in reading.voltammograms) or 1.0
    for place, (one, name) in enumerate(zip(reading.voltammograms, names, strict=True)):
        colour = shades(0.74 + 0.26 * abs(one.level_na) / largest)
        axes.plot(reading.potential_v, one.current_na, color=colour, linestyle=LINES[place % len(LINES)], label=name)
    for peak, mark, word in (
        (reading.peaks.oxidation, MARKS[2], "oxidation"),
        (reading.peaks.reduction, MARKS[4], "reduction"),
    ):
        if peak is not None:
            label = f"{word} {_volts(peak.potential_v)} V"
            axes.plot(peak.potential_v, peak.current_na, mark, color=INK, markersize=7, label=label)
    axes.axhline(0, color=QUIET, linewidth=0.6)
    axes.legend(loc="best")
    return labelled(axes, "Voltammograms", "potential (V)", "current (nA)")


def draw_sheet(axes: Axes, reading: ScanReading, sheet: ScanSheet) -> Axes:
    """Current over time and along the scan, less the first background; blue is below zero, brown above."""
    change, _ = response_map(sheet, reading)
    peaks = [one.current_na for one in reading.voltammograms]
    most = max(float(abs(one).max()) for one in peaks)
    points = len(reading.potential_v)
    extent = (float(reading.time_s[0]), float(reading.time_s[-1]), 0.0, float(points - 1))
    drawn = axes.imshow(
        change.T, origin="lower", aspect="auto", extent=extent, cmap=two_sided(), vmin=-most, vmax=most, rasterized=True
    )
    _potentials_along(axes, reading)
    for one in reading.voltammograms:
        axes.axvline(one.injection.start_s, color=INK, linewidth=0.7, linestyle=":")
    bar = axes.figure.colorbar(drawn, ax=axes, pad=0.02)
    bar.set_label("nA")
    return labelled(axes, "Change since the first background", "time (s)", "potential along the scan (V)")


def _signal(axes: Axes, clock: Array, signal: Array) -> None:
    """As it is up to 20,000 samples; beyond, the lowest and highest of each stretch, so that no spike is lost."""
    import numpy as np

    size = len(clock) // (_MOST_DRAWN // 2)
    if size > 1:
        whole = len(clock) // size * size
        parts = signal[:whole].reshape(-1, size)
        clock = np.repeat(clock[:whole].reshape(-1, size).mean(1), 2)
        signal = np.column_stack([parts.min(1), parts.max(1)]).ravel()
    axes.plot(clock, signal, color=QUIET, linewidth=0.7, label="signal")


def _plateaus(axes: Axes, windows: Sequence[Span], levels: Sequence[float]) -> None:
    for place, (window, level) in enumerate(zip(windows, levels, strict=True)):
        label = "plateau" if place == 0 else None
        axes.plot([window.start_s, window.end_s], [level, level], color=BROWN, linewidth=3, label=label)


def _injections(axes: Axes, spans: Sequence[Span], levels: Sequence[float], concentration_um: Sequence[float]) -> None:
    """Shaded; numbered and named above the plateau, where there is room beside each other."""
    names = [shown_concentration(value) for value in concentration_um] or [""] * len(spans)
    axes.margins(y=0.2)
    for place, (span, level, name) in enumerate(zip(spans, levels, names, strict=True), 1):
        axes.axvspan(span.start_s, span.end_s, color=QUIET, alpha=0.12, linewidth=0)
        text = f"{place}\n{name}" if name else f"{place}"
        axes.annotate(
            text,
            ((span.start_s + span.end_s) / 2, level),
            xytext=(0, 7 if level >= 0 else -7),
            textcoords="offset points",
            ha="center",
            va="bottom" if level >= 0 else "top",
            fontsize=7,
            color=INK,
        )


def _clear(levels: Sequence[float], noise_na: float) -> list[float]:
    """Beyond the noise, so that a name stands beside the signal and not in it."""
    return [level + (3 if level >= 0 else -3) * noise_na for level in levels]


def _potentials_along(axes: Axes, reading: ScanReading) -> None:
    """Along a scan the potential goes there and back: its turns are named where they stand, and round ones between."""
    import numpy as np

    scan = reading.potential_v
    turns = np.flatnonzero(np.diff(np.sign(np.diff(scan))) != 0) + 1
    places = [0, *turns.tolist(), len(scan) - 1]
    kept = [at for place, at in enumerate(places) if place == 0 or at - places[place - 1] > 1]
    ticks = [(float(at), float(scan[at])) for at in kept]
    for first, last in pairwise(kept):
        ticks += _round_between(scan[first : last + 1], first)
    ticks.sort()
    axes.set_yticks([at for at, _ in ticks], [_volts(potential) for _, potential in ticks])
    axes.spines["left"].set_visible(False)


def _round_between(leg: Array, first: int) -> list[tuple[float, float]]:
    """Places of round potentials on a leg that goes one way, with room to the turns at its ends."""
    import numpy as np

    low, high = sorted((float(leg[0]), float(leg[-1])))
    room = 0.12 * (high - low)
    if not room:
        return []
    along = np.arange(len(leg)) if leg[-1] > leg[0] else np.arange(len(leg))[::-1]
    rising = leg if leg[-1] > leg[0] else leg[::-1]
    chosen = [one for one in round_ticks(low, high, about=3) if low + room < one < high - room]
    return [(first + float(np.interp(one, rising, along)), one) for one in chosen]


def _volts(potential_v: float) -> str:
    """With the minus sign that the axes have."""
    return shown_number(potential_v).replace("-", "−")
