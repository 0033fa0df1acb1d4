"""A probe's course as a picture: readings with their intervals, the truth as believed, the forecast, the limit."""

from __future__ import annotations

from collections.abc import Sequence
from pathlib import Path
from typing import TYPE_CHECKING

from electrolog.answers.course import Course, Mark
from electrolog.errors import InputError
from electrolog.show.courses import interval, known, title
from electrolog.show.figures import BLUE, BROWN, INK, MARKS, QUIET, figure, labelled, legend_beside
from electrolog.units import shown_percent

if TYPE_CHECKING:
    from matplotlib.axes import Axes

MOST_PANELS = 12
_SIGNS = {"coating": MARKS[1], "cleaning": MARKS[4], "re-cut": MARKS[3], "exposure": "|", "retirement": MARKS[6]}
_WORDS = {"exposure": "end of a run"}


def draw(path: Path, courses: Sequence[Course]) -> None:
    """Raises InputError where there is nothing to draw, or more than one page holds."""
    drawn = [course for course in courses if known(course)]
    if not drawn:
        raise InputError("figure: no such calibration gives a sensitivity, so that there is no course to draw")
    if len(drawn) > MOST_PANELS:
        raise InputError(
            f"figure: {len(drawn)} courses are too many for one picture; accepted: up to {MOST_PANELS}",
            "name fewer probes, or choose with --analyte and --waveform",
        )
    columns = 1 if len(drawn) < 3 else 2
    rows = -(-len(drawn) // columns)
    with figure(path, 7.2 * columns, 3.9 * rows) as paper:
        places = paper.subplots(rows, columns, squeeze=False).ravel().tolist()
        for axes, course in zip(places, drawn, strict=False):
            draw_course(axes, course)
        for axes in places[len(drawn) :]:
            axes.set_visible(False)


def draw_course(axes: Axes, course: Course) -> Axes:
    """Sensitivity from zero against hours of exposure in all settings."""
    _ahead(axes, course)
    _believed(axes, course)
    _readings(axes, course)
    if course.limit_na_um is not None:
        label = f"least share left, {shown_percent(course.limit_share)}"
        axes.axhline(course.limit_na_um, color=BROWN, linestyle="--", label=label)
    _top(axes, course)
    _marks(axes, course.marks)
    legend_beside(axes)
    if course.why_not_ahead:
        axes.annotate(
            f"no forecast: {course.why_not_ahead}", (0.01, 0.09), xycoords="axes fraction", fontsize=7, color=QUIET
        )
    return labelled(axes, title(course), "exposure (h)", "sensitivity (nA/µM)")


def _ahead(axes: Axes, course: Course) -> None:
    if not course.ahead:
        return
    hours = [one.exposure_h for one in course.ahead]
    low, high = [one.low_na_um for one in course.ahead], [one.high_na_um for one in course.ahead]
    axes.fill_between(hours, low, high, color=BLUE, alpha=0.18, linewidth=0, label="forecast, 90 % band")
    axes.plot(hours, [one.median_na_um for one in course.ahead], color=BLUE, label=f"its median, {course.setting}")


def _believed(axes: Axes, course: Course) -> None:
    """Wide and pale behind the readings: the interval of the truth, beside that of each reading."""
    for place, one in enumerate(course.believed):
        label = "truth as believed, 90 %" if place == 0 else None
        axes.plot(
            [one.exposure_h] * 2,
            [one.low_na_um, one.high_na_um],
            color=BLUE,
            alpha=0.35,
            linewidth=6,
            solid_capstyle="butt",
            label=label,
        )


def _readings(axes: Axes, course: Course) -> None:
    found = known(course)
    hours = [sum(one.exposure_h.values()) for one in found]
    values = [one.figures.sensitivity_na_um or 0.0 for one in found]
    for at, one in zip(hours, found, strict=True):
        ends = interval(one)
        if ends is not None:
            axes.plot([at, at], ends, color=INK, linewidth=1.1)
    # A reading of nearly nothing stands on the frame: whole, and over the marks at the foot.
    axes.plot(hours, values, MARKS[0], color=INK, label="calibration, 95 % interval", clip_on=False, zorder=3)
    references = [(at, value) for at, value, one in zip(hours, values, found, strict=True) if one.is_reference]
    if references:
        axes.plot(
            *zip(*references, strict=True), "o", markersize=10, markerfacecolor="none", color=INK, label="reference"
        )


def _top(axes: Axes, course: Course) -> None:
    """An endless interval must not flatten the rest."""
    values = [one.figures.sensitivity_na_um or 0.0 for one in known(course)]
    most = max([*values, *[one.high_na_um for one in (*course.ahead, *course.believed)], course.limit_na_um or 0.0])
    ends = [ends[1] for ends in map(interval, known(course)) if ends is not None]
    axes.set_ylim(min(0.0, *values) * 1.1, min(max([most, *ends]), 2 * most) * 1.08 or 1.0)


def _marks(axes: Axes, marks: Sequence[Mark]) -> None:
    """In a row at the foot, the runs' ends beneath it, where a cleaning would else hide them; the legend names each."""
    for what in dict.fromkeys(mark.what for mark in marks):
        hours = [mark.exposure_h for mark in marks if mark.what == what]
        axes.plot(
            hours,
            [0.016 if what == "exposure" else 0.052] * len(hours),
            _SIGNS[what],
            transform=axes.get_xaxis_transform(),
            color=QUIET,
            markersize=7,
            label=_WORDS.get(what, what),
        )
