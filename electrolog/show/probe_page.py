"""One probe's part of a report: what the template is given, as text."""

from __future__ import annotations

from datetime import datetime
from typing import Any

from electrolog.answers.assigning import Placed
from electrolog.answers.course import Course
from electrolog.answers.history import Reading
from electrolog.answers.report import Planned, ProbeSheet
from electrolog.clock import shown_moment
from electrolog.record.sheets import BY_NAME
from electrolog.show.calibrations import sentences
from electrolog.show.courses import interval, title
from electrolog.show.history import share
from electrolog.show.journal import change_shown
from electrolog.show.life import what_happened
from electrolog.show.line_figure import fitted_curve
from electrolog.show.page import verdict_context
from electrolog.show.page_charts import course_chart, line_chart
from electrolog.units import shown_concentration, shown_duration, shown_number, shown_span

_SIZES = (("exposed_length_um", "exposed length", "µm"), ("diameter_um", "diameter", "µm"))


def planned_said(planned: Planned) -> str:
    run, needs = planned.run, planned.demands.needs_um
    parts = [f"{shown_duration(run.run_min)} {run.setting}", run.analyte, run.waveform]
    parts += [] if needs is None else [f"down to {shown_concentration(needs)}"]
    parts += [f"project {planned.demands.project}"] if planned.demands.project else []
    return ", ".join(parts)


def probe_context(one: ProbeSheet, id_: str, run: Placed | None = None) -> dict[str, Any]:
    """run: the one of a plan that the verdict is for."""
    readings = [reading for course in one.courses for reading in course.readings]
    return {
        "id": id_,
        "name": one.probe["electrode"],
        "identity": _identity(one),
        "judged_for": _judged_for(one, run),
        "verdict": None if one.verdict is None else verdict_context(one.verdict),
        "courses": [_course(course, one, f"{id_}c{place}") for place, course in enumerate(one.courses)],
        "timeline": [(_unbroken(event.at), event.name, what_happened(event)) for event in one.life],
        "calibrations": [_calibration(reading, f"{id_}k{place}") for place, reading in enumerate(readings)],
        "corrections": [
            (
                entry.seq,
                _unbroken(entry.at),
                entry.who,
                f"{entry.action} {BY_NAME[entry.sheet].one} {entry.row_id}",
                change_shown(entry),
                entry.reason,
            )
            for entry in one.corrections
        ],
    }


def _judged_for(one: ProbeSheet, run: Placed | None) -> str:
    if one.planned is None:
        return ""
    which = "" if run is None else f"{run.label}, {shown_moment(run.start)}: "
    return f"for {which}{planned_said(one.planned)}"


def _unbroken(moment: datetime) -> str:
    """A date and its time stay on one line."""
    return shown_moment(moment).replace(" ", "\N{NO-BREAK SPACE}")


def _identity(one: ProbeSheet) -> list[tuple[str, str]]:
    probe, state = one.probe, one.state
    said = [("batch", probe["batch"]), ("made on", probe["made_on"]), ("made by", probe["made_by"])]
    said += [("fibre", probe["fibre"]), ("insulation", probe["insulation"]), ("seal", probe["seal"])]
    said += [("geometry", probe["geometry"])]
    said += [(name, f"{shown_number(probe[key])} {unit}") for key, name, unit in _SIZES if probe[key] is not None]
    hours = ", ".join(f"{shown_number(h)} h {setting}" for setting, h in sorted(state.exposure_h.items()))
    said += [("state", f"{state.name} ({state.reason})" if state.reason else state.name)]
    said += [("exposed", hours or "never"), ("uses", state.uses), ("note", probe["note"])]
    return [(name, str(value)) for name, value in said if value is not None]


def _course(course: Course, one: ProbeSheet, id_: str) -> dict[str, Any]:
    return {
        "id": id_,
        "title": title(course),
        "chart": course_chart(course),
        "why_not": course.why_not_ahead,
        "factors": [_factor(reading, one) for reading in course.readings],
        "ahead": [
            tuple(map(shown_number, (held.exposure_h, held.low_na_um, held.median_na_um, held.high_na_um)))
            for held in course.ahead
        ],
    }


def _factor(reading: Reading, one: ProbeSheet) -> tuple[str, ...]:
    ends = interval(reading)
    return (
        reading.calibration,
        _unbroken(reading.at),
        shown_number(sum(reading.exposure_h.values())),
        shown_number(reading.figures.sensitivity_na_um),
        "not known" if ends is None else shown_span(*ends),
        share(reading),
        _valid(reading, one),
    )


def _valid(reading: Reading, one: ProbeSheet) -> str:
    """A factor holds until something happens that it can't know of, or a newer one is there."""
    since = one.void.get(reading.calibration)
    if since is None:
        return "superseded"
    return f"no longer: {'; '.join(since)}" if since else "yes: nothing has happened since"


def _calibration(reading: Reading, id_: str) -> dict[str, Any]:
    return {"id": id_, "chart": line_chart(reading), "lines": sentences(reading), "points": _points(reading)}


def _points(reading: Reading) -> list[tuple[str, str, str]]:
    fitted = fitted_curve(reading.points, reading.figures, [x for x, _ in reading.points]) if reading.points else None
    left = [None] * len(reading.points) if fitted is None else fitted
    return [
        (shown_concentration(x), shown_number(y), "" if at is None else shown_number(y - at, 2))
        for (x, y), at in zip(reading.points, left, strict=True)
    ]
