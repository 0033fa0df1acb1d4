"""A week's planned runs, as a CSV file or as typed: every fault of the file at once, with what would be accepted."""

from __future__ import annotations

import csv
from collections.abc import Callable, Iterable, Mapping
from dataclasses import dataclass
from datetime import datetime, tzinfo
from pathlib import Path
from typing import TypeVar

from electrolog.answers.asked import Run
from electrolog.clock import parse_moment
from electrolog.errors import ElectrologError, FaultyRows, InputError, shortened, unknown
from electrolog.texts import small_text
from electrolog.units import CONCENTRATION_UM, MINUTES, parse_quantity

REQUIRED = ("label", "start", "duration", "analyte", "waveform", "setting")
Read = TypeVar("Read")
COLUMNS = (*REQUIRED, "needs", "project")
MOST_RUNS = 2000


@dataclass(frozen=True)
class PlanRow:
    """One planned run: its place in the week, and what it asks of a probe."""

    label: str
    start: datetime
    run: Run
    needs_um: float | None = None
    project: str = ""


def read_plan(path: Path, zone: tzinfo | None) -> list[PlanRow]:
    """Raises FaultyRows with every fault, InputError for a file that is no plan."""
    text = small_text(path, "a CSV file in UTF-8")
    reader = csv.DictReader(text.splitlines())
    _check_header(path.name, reader.fieldnames or [])
    return plan_of(((f"{path.name} line {reader.line_num}", row) for row in reader), zone)


def plan_of(rows: Iterable[tuple[str, Mapping[str, str | None]]], zone: tzinfo | None) -> list[PlanRow]:
    """From (where it stands, its cells). Raises FaultyRows, or InputError where there is no run or too many."""
    found: list[PlanRow] = []
    faults: list[str] = []
    seen: set[str] = set()
    for where, cells in rows:
        one = _row(where, cells, zone, faults)
        if one is not None and one.label in seen:
            faults.append(
                f"{where}, label: '{shortened(one.label)}' stands twice; accepted: a label of its own per run"
            )
        elif one is not None:
            seen.add(one.label)
            found.append(one)
    if faults:
        raise FaultyRows(f"{len(faults)} faults in the plan; nothing was assigned", faults)
    if not 1 <= len(found) <= MOST_RUNS:
        raise InputError(f"the plan holds {len(found)} runs; accepted: 1 to {MOST_RUNS}")
    return found


def typed(text: str) -> dict[str, str]:
    """`Mon=2026-03-02T09:00,2h`. Raises InputError."""
    label, equals, rest = text.partition("=")
    start, comma, duration = rest.rpartition(",")
    if not (equals and comma and label.strip()):
        raise InputError(
            f"'{shortened(text)}' is no run; accepted: LABEL=START,DURATION, such as Mon=2026-03-02T09:00,2h"
        )
    return {"label": label.strip(), "start": start.strip(), "duration": duration.strip()}


def _check_header(name: str, header: Iterable[str]) -> None:
    names = [column.strip() for column in header]
    for column in names:
        if column not in COLUMNS:
            raise unknown(f"column of {name}", column, COLUMNS)
    missing = [column for column in REQUIRED if column not in names]
    if missing:
        raise InputError(f"{name} lacks {', '.join(missing)}; accepted: the columns {', '.join(COLUMNS)}")


def _row(where: str, cells: Mapping[str, str | None], zone: tzinfo | None, faults: list[str]) -> PlanRow | None:
    texts = {(name or "").strip(): (value or "").strip() for name, value in cells.items() if isinstance(value, str)}
    before = len(faults)
    faults += [f"{where}, {column}: empty; accepted: a value" for column in REQUIRED if not texts.get(column)]
    if None in cells:
        faults.append(f"{where}: more cells than the header has columns")
    start = _read(where, faults, lambda: parse_moment(texts["start"], zone, "start")) if texts.get("start") else None
    duration = _read(where, faults, lambda: _minutes(texts["duration"])) if texts.get("duration") else None
    needs = _read(where, faults, lambda: _needs(texts["needs"])) if texts.get("needs") else None
    if len(faults) > before or start is None or duration is None:
        return None
    run = Run(texts["analyte"], texts["waveform"], texts["setting"], duration)
    return PlanRow(texts["label"], start, run, needs, texts.get("project", ""))


def _read(where: str, faults: list[str], read: Callable[[], Read]) -> Read | None:
    try:
        return read()
    except ElectrologError as error:
        faults.append(f"{where}, {error.message}")
        return None


def _minutes(text: str) -> float:
    minutes = parse_quantity(text, MINUTES, "duration")
    if not minutes > 0:
        raise InputError(f"duration: {shortened(text)} is no run; accepted: longer than zero, such as 4h")
    return minutes


def _needs(text: str) -> float:
    needs_um = parse_quantity(text, CONCENTRATION_UM, "needs")
    if not needs_um > 0:
        raise InputError(f"needs: {shortened(text)} is no signal; accepted: above zero, such as 50nM")
    return needs_um
