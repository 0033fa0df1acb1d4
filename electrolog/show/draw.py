"""Every figure on an Axes: each takes what the lab answers and an Axes (None: a new one), and returns the Axes.

    from electrolog import draw
    draw.history(lab.courses(["B1-01"])[0])
    draw.reliability(lab.backtest("dopamine"), axes)

The names in __all__ are what other programs may rely on.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from typing import TYPE_CHECKING

from electrolog.errors import InputError, unknown
from electrolog.show.figures import on_axes

if TYPE_CHECKING:
    from matplotlib.axes import Axes

    from electrolog.answers.backtesting import Backtest
    from electrolog.answers.comparing import Compared
    from electrolog.answers.controlling import Controlled
    from electrolog.answers.course import Course
    from electrolog.answers.fan import Fan
    from electrolog.answers.fitting import FittedCohort
    from electrolog.answers.history import Reading
    from electrolog.answers.signals import Recorded
    from electrolog.fouling.typical import TypicalLoss
    from electrolog.judge.compare import Groups
    from electrolog.measure.scan_sheet import ScanSheet
    from electrolog.measure.scans import ScanReading
    from electrolog.measure.trace import TraceReading

__all__ = [
    "calibration",
    "cusum",
    "days",
    "ewma",
    "fan",
    "history",
    "individuals",
    "moving_range",
    "pit",
    "reliability",
    "residuals",
    "scan_trace",
    "sheet",
    "spread",
    "survival",
    "trace",
    "voltammograms",
]


def history(course: Course, axes: Axes | None = None) -> Axes:
    """A probe's sensitivity (nA/µM) against its exposure (h), with what is believed and what is ahead.

    `course`: of `lab.courses`. Raises InputError where no calibration gives a sensitivity.
    """
    from electrolog.show.course_figure import draw_course
    from electrolog.show.courses import known

    if not known(course):
        raise InputError(f"{course.electrode}: no calibration gives a sensitivity; accepted: a course with one")
    with on_axes(axes) as place:
        return draw_course(place, course)


def calibration(reading: Reading, axes: Axes | None = None) -> Axes:
    """Points (µM, nA) of one of `lab.readings`, and what was made of them. Raises InputError where none were kept."""
    from electrolog.show.line_figure import draw_line

    with on_axes(axes) as place:
        drawn = draw_line(place, _points(reading), reading.figures)
        drawn.set_title(f"{reading.calibration}  {reading.electrode}")
        return drawn


def residuals(reading: Reading, axes: Axes | None = None) -> Axes:
    """What the line of one of `lab.readings` leaves over (nA). Raises InputError where no points were kept."""
    from electrolog.show.line_figure import draw_residuals

    with on_axes(axes) as place:
        return draw_residuals(place, _points(reading), reading.figures)


def fan(
    fit: FittedCohort, fan: Fan, coating: str | None = None, waveform: str | None = None, axes: Axes | None = None
) -> Axes:
    """Every probe's share left with the typical one's, of one kind: by default the kind with the most probes.

    `fit` of `lab.cohort_fit`, `fan` of `lab.fan`. Raises InputError where there is no such kind.
    """
    from electrolog.show.cohort_figure import draw_fan, of_kind

    kinds = [one for one in fan.typical if coating in (None, one.coating) and waveform in (None, one.waveform)]
    if not kinds:
        raise InputError(f"fan: no such kind of probe; accepted: {_kinds(fan.typical)}")
    largest = max(kinds, key=lambda one: len(of_kind(fan, one)))
    with on_axes(axes) as place:
        return draw_fan(place, largest, of_kind(fan, largest), fit.shapes)


def days(fit: FittedCohort, axes: Axes | None = None) -> Axes:
    """By how much (%) all readings of each calibration day stood off; `fit` of `lab.cohort_fit`."""
    from electrolog.show.cohort_figure import draw_days

    with on_axes(axes) as place:
        return draw_days(place, fit.days)


def spread(compared: Compared, groups: Groups, measure: str | None = None, axes: Axes | None = None) -> Axes:
    """Every probe's value by group, beside it the group's mean with its 95 % interval.

    `compared` of `lab.compare`, `groups` of `lab.groups`; `measure`: a name of `groups.values` (None: the first).
    """
    from electrolog.show.groups_figure import draw_spread

    name = measure or next(iter(groups.values), "")
    if name not in groups.values:
        raise unknown("measure", name, groups.values)
    estimates = [one for one in compared.comparison.estimates if one.measure == name]
    with on_axes(axes) as place:
        return draw_spread(place, name, groups.values[name], estimates)


def survival(groups: Groups, axes: Axes | None = None) -> Axes:
    """Share of probes not yet retired against hours worth as in vivo, by group; `groups` of `lab.groups`."""
    from electrolog.show.groups_figure import draw_survival

    if not groups.lives:
        raise InputError("survival: no group has a life to draw; accepted: groups whose probes were used")
    with on_axes(axes) as place:
        return draw_survival(place, groups.lives)


def individuals(chart: Controlled, axes: Axes | None = None) -> Axes:
    """Control chart of single readings; `chart`: one of `lab.control`."""
    from electrolog.show.control_figure import draw_individuals

    return _charted(draw_individuals, chart, axes)


def moving_range(chart: Controlled, axes: Axes | None = None) -> Axes:
    from electrolog.show.control_figure import draw_range

    return _charted(draw_range, chart, axes)


def ewma(chart: Controlled, axes: Axes | None = None) -> Axes:
    from electrolog.show.control_figure import draw_ewma

    return _charted(draw_ewma, chart, axes)


def cusum(chart: Controlled, axes: Axes | None = None) -> Axes:
    from electrolog.show.control_figure import draw_cusum

    return _charted(draw_cusum, chart, axes)


def reliability(backtest: Backtest, axes: Axes | None = None) -> Axes:
    """Of intervals of each level, the share that held its reading; `backtest` of `lab.backtest`."""
    from electrolog.show.backtest_figure import draw_reliability

    with on_axes(axes) as place:
        return draw_reliability(place, backtest)


def pit(backtest: Backtest, axes: Axes | None = None) -> Axes:
    """Where in its forecast each reading fell."""
    from electrolog.show.backtest_figure import draw_pit

    with on_axes(axes) as place:
        return draw_pit(place, backtest.methods[0])


def trace(recorded: Recorded, axes: Axes | None = None) -> Axes:
    """A flow-cell recording less its drift, with its injections; `recorded` of `lab.read_trace`."""
    from electrolog.show.signal_figures import draw_trace

    with on_axes(axes) as place:
        return draw_trace(place, _trace(recorded), recorded.concentration_um)


def scan_trace(recorded: Recorded, axes: Axes | None = None) -> Axes:
    """The current at the potential where points are taken; `recorded` of `lab.read_scans`."""
    from electrolog.show.signal_figures import draw_scan_trace

    with on_axes(axes) as place:
        return draw_scan_trace(place, _scans(recorded)[0], recorded.concentration_um)


def voltammograms(recorded: Recorded, axes: Axes | None = None) -> Axes:
    """Current against potential of each injection; `recorded` of `lab.read_scans`."""
    from electrolog.show.signal_figures import draw_voltammograms

    with on_axes(axes) as place:
        return draw_voltammograms(place, _scans(recorded)[0], recorded.concentration_um)


def sheet(recorded: Recorded, axes: Axes | None = None) -> Axes:
    """Current over time and along the scan, less the first background; `recorded` of `lab.read_scans`."""
    from electrolog.show.signal_figures import draw_sheet

    with on_axes(axes) as place:
        return draw_sheet(place, *_scans(recorded))


def _charted(drawing: Callable[[Axes, Controlled], Axes], chart: Controlled, axes: Axes | None) -> Axes:
    with on_axes(axes) as place:
        return drawing(place, chart)


def _points(reading: Reading) -> Sequence[tuple[float, float]]:
    if not reading.points:
        raise InputError(f"{reading.calibration}: only its factor was kept; accepted: a calibration with points")
    return reading.points


def _kinds(typical: Sequence[TypicalLoss]) -> str:
    return ", ".join(f"{one.coating} with {one.waveform}" for one in typical) or "none yet: the fit knows no kind"


def _trace(recorded: Recorded) -> TraceReading:
    from electrolog.measure.trace import TraceReading

    if not isinstance(recorded.reading, TraceReading):
        raise InputError("this figure is of a trace; accepted: what lab.read_trace gives")
    return recorded.reading


def _scans(recorded: Recorded) -> tuple[ScanReading, ScanSheet]:
    from electrolog.measure.scans import ScanReading

    if not isinstance(recorded.reading, ScanReading) or recorded.sheet is None:
        raise InputError("this figure is of scans; accepted: what lab.read_scans gives")
    return recorded.reading, recorded.sheet
