"""A week's planned runs as a report tells them: who serves which run, and the sheet of every probe that does."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from datetime import datetime

from electrolog.answers.asked import Run
from electrolog.answers.assigning import Assignment, Placed, assigned
from electrolog.answers.checking import Demands
from electrolog.answers.plan import PlanRow
from electrolog.answers.report import Planned, ProbeSheet, probe_sheets
from electrolog.record.store import Record

TURNAROUND_MIN = 60.0


@dataclass(frozen=True)
class WeekSheet:
    """runs in the order of time; first: by probe, the run for which its sheet judges it."""

    assignment: Assignment
    runs: tuple[Placed, ...]
    first: dict[str, Placed]


def week_sheet(record: Record, plan: Sequence[PlanRow], moment: datetime) -> WeekSheet:
    """Raises FaultyRows and InputError as an assignment does."""
    found = assigned(record, plan, turnaround_min=TURNAROUND_MIN, moment=moment)
    runs = tuple(sorted(found.runs, key=lambda run: (run.start, run.label)))
    first: dict[str, Placed] = {}
    for run in runs:
        if run.electrode is not None:
            first.setdefault(run.electrode, run)
    return WeekSheet(found, runs, first)


def sheets_of_week(record: Record, week: WeekSheet, plan: Sequence[PlanRow], moment: datetime) -> list[ProbeSheet]:
    """Each serving probe, judged for the first run that it serves; in the order of these runs."""
    rows = {row.label: row for row in plan}
    alike: dict[tuple[Run, float | None, str], list[str]] = {}
    for label, first in week.first.items():
        row = rows[first.label]
        alike.setdefault((row.run, row.needs_um, row.project), []).append(label)
    found = {
        sheet.probe["electrode"]: sheet
        for (run, needs_um, project), labels in alike.items()
        for sheet in probe_sheets(record, labels, Planned(run, Demands(needs_um, project)), moment)
    }
    return [found[label] for label in week.first]
