"""The report as one page that needs nothing else: of probes, of a plan's runs, or of the whole lab."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from electrolog.answers.report import LabSheet, Origin, Planned, ProbeSheet
from electrolog.answers.report_week import WeekSheet
from electrolog.show.assignment import COLUMNS, row, said_of
from electrolog.show.lab_page import lab_context
from electrolog.show.page import CAUTIONS
from electrolog.show.pages import origin_said, own_file, rendered
from electrolog.show.probe_page import planned_said, probe_context


@dataclass(frozen=True)
class Told:
    """What a report is of. planned: the run that all are judged for; with a week each probe has its own."""

    title: str
    made: Origin
    probes: Sequence[ProbeSheet] = ()
    lab: LabSheet | None = None
    planned: Planned | None = None
    week: WeekSheet | None = None


def write_report(path: Path, told: Told) -> None:
    path.write_text(report(told), encoding="utf-8", newline="\n")


def report(told: Told) -> str:
    lab = None if told.lab is None else lab_context(told.lab)
    probes = [_probe(told, place) for place in range(len(told.probes))]
    return rendered(
        "report.html",
        title=told.title,
        origin=origin_said(told.made),
        planned="" if told.planned is None or lab is None else planned_said(told.planned),
        places=_places(told, lab, probes),
        probes=probes,
        alone=len(probes) == 1 and lab is None and told.week is None,
        lab=lab,
        week=None if told.week is None else _week(told.week),
        cautions=CAUTIONS,
        style=own_file("style.css"),
        script=own_file("report.js"),
    )


def _probe(told: Told, place: int) -> dict[str, Any]:
    one = told.probes[place]
    run = None if told.week is None else told.week.first.get(one.probe["electrode"])
    return probe_context(one, f"p{place}", run)


def _places(told: Told, lab: dict[str, Any] | None, probes: list[dict[str, Any]]) -> list[tuple[str, str]]:
    """Links to what stands far down; none where a page is short."""
    found = [] if told.week is None else [("runs", "planned runs")]
    if lab is not None:
        found += [("shelf-head", "shelf"), ("week", "this week"), ("batches", "batches")]
        found += [(one["id"], f"how probes foul: {one['analyte']}") for one in lab["cohorts"]]
        found += [("tested", "backtest")]
    found += [(one["id"], one["name"]) for one in probes]
    return found if len(found) > 1 else []


def _week(week: WeekSheet) -> dict[str, Any]:
    said = [*said_of(week.assignment), *week.assignment.notes]
    return {"columns": COLUMNS, "rows": [row(run, None) for run in week.runs], "said": said}
