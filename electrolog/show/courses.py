"""A probe's course in the terminal: a chart of its sensitivity, or the same in sentences."""

from __future__ import annotations

from collections.abc import Sequence
from datetime import timedelta

from electrolog.answers.course import Course, Held, Mark
from electrolog.answers.history import Reading
from electrolog.clock import shown_moment
from electrolog.record import sheets
from electrolog.show.tables import print_lines
from electrolog.show.terminal import Chart, Drawing
from electrolog.show.text import safe
from electrolog.units import counted, shown_number, shown_percent, shown_span

MOST_CHARTS = 6
_SIGNS = {"coating": "C", "cleaning": "W", "re-cut": "X", "exposure": "r", "retirement": "E"}
_WORDS = {"C": "coating", "W": "cleaning", "X": "re-cut", "r": "end of a run", "E": "retired"}


def answer(courses: Sequence[Course], how: Drawing, by_time: bool) -> None:
    """Nothing where nobody looks; charts of the first few, since more would scroll away."""
    if how is Drawing.NONE:
        return
    for course in courses[:MOST_CHARTS]:
        if how is Drawing.CHART and known(course):
            _print_chart(course, by_time)
        else:
            print_lines(*sentences(course), "")
    if len(courses) > MOST_CHARTS:
        print_lines(f"({len(courses) - MOST_CHARTS} more are not drawn: name fewer probes, or choose with --analyte)")


def known(course: Course) -> list[Reading]:
    return [reading for reading in course.readings if reading.figures.sensitivity_na_um is not None]


def interval(reading: Reading) -> tuple[float, float] | None:
    """95 % interval of one calibration's sensitivity; None where its error isn't known."""
    own = reading.figures
    if own.sensitivity_low_na_um is not None and own.sensitivity_high_na_um is not None:
        return own.sensitivity_low_na_um, own.sensitivity_high_na_um
    if own.sensitivity_na_um is None or own.sensitivity_se_na_um is None:
        return None
    half = 1.96 * own.sensitivity_se_na_um
    return own.sensitivity_na_um - half, own.sensitivity_na_um + half


def title(course: Course) -> str:
    return f"{course.electrode}: sensitivity to {course.analyte}, {course.waveform}"


def _print_chart(course: Course, by_time: bool) -> None:
    start = course.readings[0].at
    ahead = () if by_time else course.ahead
    days = timedelta(days=1)
    if by_time:
        x = [(one.at - start) / days for one in known(course)]
        marks = [(_SIGNS[mark.what], (mark.at - start) / days) for mark in course.marks if mark.at >= start]
        along = f"days since {shown_moment(start)[:10]}"
    else:
        x = [sum(one.exposure_h.values()) for one in known(course)]
        marks = [(_SIGNS[mark.what], mark.exposure_h) for mark in course.marks]
        along = "hours of exposure"
    chart = Chart(
        along, "nA/µM", x=_span([*x, *[at for _, at in marks], *[h.exposure_h for h in ahead]]), y=_up(course)
    )
    _draw(chart, course, x, ahead, marks)
    print_lines(title(course))
    print(safe("\n".join(chart.text())))  # noqa: T201
    print_lines(*_legend(course, ahead, marks), "")


def _draw(
    chart: Chart, course: Course, x: Sequence[float], ahead: Sequence[Held], marks: Sequence[tuple[str, float]]
) -> None:
    hours = [one.exposure_h for one in ahead]
    chart.band(hours, [one.low_na_um for one in ahead], [one.high_na_um for one in ahead])
    if course.limit_na_um is not None:
        chart.level(course.limit_na_um)
    chart.points(hours, [one.median_na_um for one in ahead], "·")
    for at, reading in zip(x, known(course), strict=True):
        band = interval(reading)
        if band is not None:
            chart.interval(at, *band)
    above = _up(course)[1] / 10  # a row higher than the end of the run that a cleaning followed
    for sign, at in marks:
        chart.points([at], [0.0 if sign == _SIGNS["exposure"] else above], sign)
    # Last, for no mark may hide a reading.
    chart.points(x, [one.figures.sensitivity_na_um or 0.0 for one in known(course)], "o")


def _span(values: Sequence[float]) -> tuple[float, float]:
    return min(0.0, *values), max(values)


def _up(course: Course) -> tuple[float, float]:
    """From zero, so that a loss looks as large as it is; an endless interval does not flatten the rest."""
    tops = [one.figures.sensitivity_na_um or 0.0 for one in known(course)]
    most = max([*tops, *[held.high_na_um for held in course.ahead], course.limit_na_um or 0.0])
    ends = [band[1] for band in map(interval, known(course)) if band is not None]
    return min(0.0, *tops), min(max([most, *ends]), 2 * most) * 1.05 or 1.0


def _legend(course: Course, ahead: Sequence[Held], marks: Sequence[tuple[str, float]]) -> list[str]:
    said = ["o calibration, | its 95 % interval"]
    if ahead:
        said.append(f"· forecast in {course.setting} with its 90 % band (shaded)")
    if course.limit_na_um is not None:
        said.append(f"- - least share left, {shown_percent(course.limit_share)}: {shown_number(course.limit_na_um)}")
    used = dict.fromkeys(sign for sign, _ in marks)
    said += [f"{sign} {_WORDS[sign]}" for sign in used]
    lines = ["; ".join(said)]
    return [*lines, f"no forecast: {course.why_not_ahead}"] if course.why_not_ahead else lines


def sentences(course: Course) -> list[str]:
    """The chart for those who can't see it: what was read is in the table."""
    said = [title(course)]
    last = known(course)[-1] if known(course) else None
    if last is None:
        said.append("no calibration gave a sensitivity")
    else:
        band = interval(last)
        inside = "error unknown" if band is None else f"95 % interval {shown_span(*band)}"
        hours, of = shown_number(sum(last.exposure_h.values())), counted(len(course.readings), "calibration")
        value = shown_number(last.figures.sensitivity_na_um)
        said.append(f"last reading {value} nA/µM ({inside}), after {hours} h of exposure, of {of}")
    if course.ahead:
        said += [_ahead(course.ahead[0], "now", ""), _ahead(course.ahead[-1], "", course.setting)]
    if course.limit_na_um is not None:
        said.append(f"least share left, {shown_percent(course.limit_share)}: {shown_number(course.limit_na_um)} nA/µM")
    said += [f"{mark.what} {mark.said} at {shown_number(mark.exposure_h)} h" for mark in _telling(course)]
    return [*said, f"no forecast: {course.why_not_ahead}"] if course.why_not_ahead else said


def _telling(course: Course) -> list[Mark]:
    return [mark for mark in course.marks if mark.what != sheets.EXPOSURES.one]


def _ahead(held: Held, when: str, setting: str) -> str:
    where = when or f"after {shown_number(held.exposure_h)} h of exposure, the rest of it in {setting}"
    span = shown_span(held.low_na_um, held.high_na_um)
    return f"forecast {where}: {shown_number(held.median_na_um)} nA/µM (90 % interval {span})"
