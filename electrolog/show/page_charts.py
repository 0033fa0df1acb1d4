"""The charts of a report's pages: a course, a calibration's line, a typical loss, the days, the spread of a batch."""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence

from electrolog.answers.course import Course
from electrolog.answers.fitting import Day
from electrolog.answers.history import Reading
from electrolog.clock import shown_moment
from electrolog.fouling.typical import Floats, TypicalLoss
from electrolog.show.courses import interval, known, title
from electrolog.show.line_figure import fitted_curve
from electrolog.show.svg import Plot
from electrolog.units import shown_concentration, shown_number, shown_percent, shown_span

LEAST_WEIGHT = 0.01
_MOST_DATES = 6
_MARKS = {"coating": "square", "cleaning": "down", "re-cut": "diamond", "exposure": "tick", "retirement": "cross"}
_MARK_HEIGHT = 0.06
_TOLD = 6  # values along a curve that say what they are
_SHAPE_LOOKS = ("curve", "curve dash", "curve dotted", "curve dashdot", "curve longdash")


def course_chart(course: Course) -> Plot | None:
    """None where no calibration gave a sensitivity."""
    found = known(course)
    if not found:
        return None
    hours = [sum(one.exposure_h.values()) for one in found]
    ahead = [one.exposure_h for one in course.ahead]
    along = [0.0, *hours, *ahead, *[mark.exposure_h for mark in course.marks]]
    plot = Plot(
        title(course), "hours of exposure", "nA/µM", (-0.03 * max(along), 1.02 * max(along)), _course_range(course)
    )
    _draw_ahead(plot, course)
    _draw_limit(plot, course)
    for held in course.believed:
        span = shown_span(held.low_na_um, held.high_na_um)
        plot.bar(held.exposure_h, held.low_na_um, held.high_na_um, "truth", f"truth as believed: {span} nA/µM (90 %)")
        plot.explain("band", "band", "truth as believed, and forecast: 90 %")
    for at, one in zip(hours, found, strict=True):
        _draw_reading(plot, at, one)
    for mark in course.marks:
        said = f"{mark.what} {mark.said}, {shown_moment(mark.at)}"
        # A cleaning usually follows a run at the same exposure: it stands above the run's end and doesn't hide it.
        height = 0.0 if mark.what == "exposure" else _MARK_HEIGHT * (plot.y[1] - plot.y[0])
        plot.dot(mark.exposure_h, plot.y[0] + height, _MARKS[mark.what], "mark", said)
        plot.explain(_MARKS[mark.what], "mark", "end of a run" if mark.what == "exposure" else mark.what)
    return plot


def _course_range(course: Course) -> tuple[float, float]:
    values = [one.figures.sensitivity_na_um or 0.0 for one in known(course)]
    most = max([*values, *[held.high_na_um for held in (*course.ahead, *course.believed)], course.limit_na_um or 0.0])
    ends = [ends[1] for ends in map(interval, known(course)) if ends is not None]
    return min(0.0, *values), min(max([most, *ends]), 2 * most) * 1.05 or 1.0


def _draw_ahead(plot: Plot, course: Course) -> None:
    if not course.ahead:
        return
    hours = [one.exposure_h for one in course.ahead]
    low, high = [one.low_na_um for one in course.ahead], [one.high_na_um for one in course.ahead]
    plot.band(hours, low, high, "band")
    plot.line(hours, [one.median_na_um for one in course.ahead], "curve")
    for one in course.ahead[:: max(1, len(course.ahead) // 4)]:
        span = shown_span(one.low_na_um, one.high_na_um)
        said = f"forecast at {shown_number(one.exposure_h)} h: {shown_number(one.median_na_um)} nA/µM ({span}, 90 %)"
        plot.dot(one.exposure_h, one.median_na_um, "circle", "small", said)
    plot.explain("line", "curve", f"forecast in {course.setting}, median")
    plot.explain("band", "band", "truth as believed, and forecast: 90 %")


def _draw_limit(plot: Plot, course: Course) -> None:
    if course.limit_na_um is None:
        return
    said = f"least share left, {shown_percent(course.limit_share)}: {shown_number(course.limit_na_um)} nA/µM"
    plot.level(course.limit_na_um, "limit", said)
    plot.explain("line", "limit", f"least share left, {shown_percent(course.limit_share)}")


def _draw_reading(plot: Plot, at: float, one: Reading) -> None:
    value, ends = one.figures.sensitivity_na_um or 0.0, interval(one)
    if ends is not None:
        plot.bar(at, *ends, "error")
    inside = "" if ends is None else f" ({shown_span(*ends)}, 95 %)"
    said = f"{one.calibration}, {shown_moment(one.at)}, {one.stage}: {shown_number(value)} nA/µM{inside}"
    plot.dot(at, value, "circle", "dot", said)
    plot.explain("circle", "dot", "calibration, 95 % interval")
    if one.is_reference:
        plot.dot(at, value, "ring", "ring", f"{one.calibration} is the reference")
        plot.explain("ring", "ring", "reference")


def line_chart(reading: Reading) -> Plot | None:
    """None where no points were kept."""
    if not reading.points:
        return None
    concentrations, currents = zip(*reading.points, strict=True)
    top = max(concentrations)
    grid = [top * k / 40 for k in range(41)]
    curve = fitted_curve(reading.points, reading.figures, grid)
    every = [*currents, *(curve or [])]
    plot = Plot(
        f"{reading.calibration}: points and line",
        "concentration (µM)",
        "nA",
        (-0.03 * top, top * 1.03),
        (min(0.0, *every), max(every) * 1.06),
        width=320.0,
        height=200.0,
    )
    if curve is not None:
        plot.line(grid, curve, "curve", f"{shown_number(reading.figures.sensitivity_na_um)} nA/µM")
    for place, (x, y) in enumerate(reading.points):
        plot.dot(x, y, "circle", "dot", f"{shown_concentration(x)}: {shown_number(y)} nA")
        if place == reading.figures.suspect_point:
            plot.dot(x, y, "ring", "ring", "suspect, kept")
    lod = reading.figures.lod_um
    if lod is not None and lod <= top:
        plot.bar(lod, *plot.y, "limit", f"detection limit {shown_concentration(lod)}")
    return plot


def loss_chart(loss: TypicalLoss, weights: Mapping[str, float]) -> Plot:
    hours = [float(one) for one in loss.hours]
    kind = "bare" if loss.coating == "none" else loss.coating
    plot = Plot(f"{kind}, {loss.waveform}", "hours in vivo", "% left", (0.0, hours[-1]), (0.0, 105.0), 420.0, 220.0)
    plot.band(hours, _percent(loss.low), _percent(loss.high), "band")
    shapes = [name for name, weight in weights.items() if weight >= LEAST_WEIGHT and name in loss.by_shape]
    for look, name in zip(_SHAPE_LOOKS, shapes, strict=False):
        plot.line(hours, _percent(loss.by_shape[name]), look, f"{name}, weight {shown_percent(weights[name])}")
        plot.explain("line", look, f"{name}, {shown_percent(weights[name])}")
    for k in range(0, len(hours), max(1, len(hours) // _TOLD)):
        median, low, high = (shown_percent(float(part[k])) for part in (loss.median, loss.low, loss.high))
        said = f"after {shown_number(hours[k])} h in vivo: {median} left ({low} to {high}, 90 %)"
        plot.dot(hours[k], 100.0 * float(loss.median[k]), "circle", "small", said)
    plot.explain("circle", "small", "median over all shapes")
    plot.explain("band", "band", "90 % over all shapes")
    return plot


def _percent(shares: Floats) -> list[float]:
    return [100.0 * float(one) for one in shares]


def days_chart(days: Sequence[Day]) -> Plot | None:
    """By how much the readings of each calibration day stood off; a suspicious one is ringed."""
    from datetime import date

    known_ones = [(date.fromisoformat(day.date).toordinal(), day) for day in days if day.effect.median is not None]
    if not known_ones:
        return None
    first = min(at for at, _ in known_ones)
    ends = [100.0 * end for _, day in known_ones for end in (day.effect.low or 0.0, day.effect.high or 0.0)]
    low, high = 1.05 * max(min(ends), -100.0), 1.05 * min(max(ends), 200.0)
    wide = (0.0, float(max(at for at, _ in known_ones) - first))
    plot = Plot("Calibration days", "date", "% off", wide, (low, high), height=220.0, x_labels=_dates(first, wide[1]))
    plot.level(0.0, "zero")
    for at, day in known_ones:
        value = 100.0 * (day.effect.median or 0.0)
        plot.bar(at - first, 100.0 * (day.effect.low or 0.0), 100.0 * (day.effect.high or 0.0), "error")
        said = f"{day.date} {day.standard} {day.rig}: {value:+.1f} %, {day.calibrations} calibrations"
        plot.dot(at - first, value, "circle", "dot", said)
        if day.suspicious:
            plot.dot(at - first, value, "ring", "odd", f"{day.date} is suspicious")
            plot.explain("ring", "odd", "suspicious")
    plot.explain("circle", "dot", "a day, 90 % interval")
    return plot


def _dates(first: int, days: float) -> list[tuple[float, str]]:
    """Evenly spaced, as many as can stand side by side."""
    from datetime import date

    step = max(1, math.ceil(days / _MOST_DATES))
    return [(float(off), date.fromordinal(first + off).isoformat()) for off in range(0, int(days) + 1, step)]
