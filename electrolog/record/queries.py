"""What is asked of the record. Status and exposure are derived here from events; nowhere are they stored."""

from __future__ import annotations

import json
from collections import defaultdict
from collections.abc import Iterable, Iterator, Mapping, Sequence
from dataclasses import dataclass
from datetime import UTC, date, datetime, timedelta
from operator import attrgetter, itemgetter
from typing import Any

from sqlalchemy import ColumnElement, Connection, Result, Select, delete, func, insert, or_, select

from electrolog.record import schema, sheets
from electrolog.record.journal import FIRST_HASH, Writer
from electrolog.record.readable import Row, readable, rows
from electrolog.record.sheets import EVENTS, Sheet

_MANY = 500  # engines limit how many parameters one statement takes; more are asked for a stretch at a time


@dataclass(frozen=True)
class Event:
    """One thing that happened to a probe: `row` is the readable row of its sheet."""

    at: datetime
    sheet: Sheet
    row: Row

    @property
    def name(self) -> str:
        """How a person refers to it: `coating 17`, or its label."""
        return f"{self.sheet.one} {self.row.get('calibration') or self.row['id']}"


@dataclass(frozen=True)
class Calibration:
    """A calibration with its live raw points (µM, nA) and, if made before, its derived figures as stored."""

    row: Row
    points: tuple[tuple[float, float], ...]
    figures: Mapping[str, Any] | None

    @property
    def at(self) -> datetime:
        moment: datetime = self.row["at"]
        return moment


def probes(connection: Connection, labels: Sequence[str] = ()) -> list[Row]:
    """Probes with their batch's columns; all of them, or those named, in the order of their labels."""
    return _probes(connection, schema.tables["electrodes"].c.electrode, labels or None)


def probes_by_id(connection: Connection, ids: Sequence[int]) -> list[Row]:
    return _probes(connection, schema.tables["electrodes"].c.id, ids)


def _probes(connection: Connection, column: ColumnElement[Any], among: Sequence[Any] | None) -> list[Row]:
    table, batch = schema.tables["electrodes"], schema.tables["batches"]
    query = (
        select(
            table.c.id,
            table.c.electrode,
            table.c.geometry,
            table.c.exposed_length_um,
            table.c.diameter_um,
            table.c.note,
            *[batch.c[name] for name in ("batch", "made_on", "made_by", "fibre", "fibre_diameter_um", "insulation")],
            batch.c.seal,
        )
        .select_from(table.outerjoin(batch, table.c.batch_id == batch.c.id))
        .where(table.c.struck.is_(None))
    )
    return sorted(_rows(connection, query, column, among), key=itemgetter("electrode"))


def calibrated_with(connection: Connection, analyte_id: int) -> list[int]:
    """Every probe of a cohort, retired ones too, by number, in the order of their labels."""
    electrodes, calibrations = schema.tables["electrodes"].c, schema.tables["calibrations"].c
    live = calibrations.analyte_id == analyte_id, calibrations.struck.is_(None)
    measured = select(calibrations.electrode_id).where(*live).distinct().subquery()
    query = select(electrodes.id, electrodes.electrode).where(electrodes.id == measured.c.electrode_id)
    found = connection.execute(query.where(electrodes.struck.is_(None))).all()
    return [row.id for row in sorted(found, key=attrgetter("electrode"))]


def events(
    connection: Connection, electrode_ids: Sequence[int] | None = None, of: Iterable[Sheet] = EVENTS
) -> dict[str, list[Event]]:
    """Events by probe label, each list in the order of time; of all probes, or of those named."""
    lives: dict[str, list[Event]] = defaultdict(list)
    for sheet in of:
        time = sheet.time_column or "at"
        column = schema.tables[sheet.name].c.electrode_id
        for row in _rows(connection, readable(sheet), column, electrode_ids):
            lives[row["electrode"]].append(Event(row[time], sheet, row))
    for life in lives.values():
        life.sort(key=lambda event: (event.at, EVENTS.index(event.sheet)))
    return dict(lives)


def calibrations(
    connection: Connection,
    electrode_ids: Sequence[int] | None = None,
    analyte_id: int | None = None,
    waveform_id: int | None = None,
    *,
    points: bool = True,
) -> list[Calibration]:
    """Calibrations with stored figures and, unless they aren't asked for, points; oldest first."""
    table = schema.tables["calibrations"]
    query = readable(sheets.CALIBRATIONS)
    if analyte_id is not None:
        query = query.where(table.c.analyte_id == analyte_id)
    if waveform_id is not None:
        query = query.where(table.c.waveform_id == waveform_id)
    found = _rows(connection, query, table.c.electrode_id, electrode_ids)
    whole = electrode_ids is None and analyte_id is None and waveform_id is None
    return _filled(connection, found, whole, points)


def calibrations_by_id(connection: Connection, ids: Sequence[int]) -> list[Calibration]:
    query = readable(sheets.CALIBRATIONS)
    return _filled(connection, _rows(connection, query, schema.tables["calibrations"].c.id, ids))


def calibrations_on_standard(connection: Connection, standard_id: int) -> list[Calibration]:
    on = schema.tables["calibrations"].c.standard_id == standard_id
    return _filled(connection, _rows(connection, readable(sheets.CALIBRATIONS).where(on)))


def calibrated_on(connection: Connection, days: Iterable[date], analyte_id: int) -> list[int]:
    """Which probes were calibrated with the analyte on any of these days (UTC), by number."""
    table = schema.tables["calibrations"]
    spans = [datetime(day.year, day.month, day.day, tzinfo=UTC) for day in days]
    # All of it stands in each part, so that each is found by the one index, which holds live rows only.
    cohort = (table.c.analyte_id == analyte_id) & table.c.struck.is_(None)
    on = [cohort & table.c.at.between(start, start + timedelta(days=1)) for start in spans]
    if not on:
        return []
    # Made distinct here: asked to do it, SQLite walks through every calibration in the order of probes.
    found = connection.execute(select(table.c.electrode_id).where(or_(*on))).scalars()
    return list(dict.fromkeys(found))


def standards(connection: Connection, labels: Iterable[str | None]) -> dict[str, Row]:
    """Those named, by label."""
    named = sorted({label for label in labels if label})
    column = schema.tables["standards"].c.standard
    return {row["standard"]: row for row in _rows(connection, readable(sheets.STANDARDS), column, named)}


def _filled(connection: Connection, found: list[Row], whole: bool = False, points: bool = True) -> list[Calibration]:
    """`whole`: they are all that there are, and so are their points and figures."""
    table, figures = schema.tables["calibration_points"], schema.calibration_figures
    ids = None if whole else [row["id"] for row in found]
    known: dict[int, list[tuple[float, float]]] = defaultdict(list)
    if points:
        query = select(table.c.calibration_id, table.c.concentration_um, table.c.current_na)
        query = query.where(table.c.struck.is_(None)).order_by(table.c.calibration_id, table.c.ordinal)
        for calibration_id, concentration, current in _tuples(connection, query, table.c.calibration_id, ids):
            known[calibration_id].append((concentration, current))
    stored = select(figures.c.calibration_id, figures.c.figures)
    kept = {key: json.loads(text) for key, text in _tuples(connection, stored, figures.c.calibration_id, ids)}
    found.sort(key=itemgetter("at", "calibration"))
    return [Calibration(row, tuple(known.get(row["id"], ())), kept.get(row["id"])) for row in found]


def _rows(
    connection: Connection, query: Select[Any], column: Any = None, among: Sequence[Any] | None = None
) -> list[Row]:
    return [dict(row) for result in _results(connection, query, column, among) for row in result.mappings()]


def _tuples(connection: Connection, query: Select[Any], column: Any, among: Sequence[Any] | None) -> Iterator[Any]:
    for result in _results(connection, query, column, among):
        yield from result


def _results(
    connection: Connection, query: Select[Any], column: Any, among: Sequence[Any] | None
) -> Iterator[Result[Any]]:
    """The query, or as many as it takes to ask for those among; never a whole table for some of its rows."""
    if among is None:
        yield connection.execute(query)
        return
    for start in range(0, len(among), _MANY):
        yield connection.execute(query.where(column.in_(among[start : start + _MANY])))


def keep_figures(writer: Writer, figures: Mapping[int, tuple[str, Mapping[str, Any]]]) -> None:
    """Stores derived figures, by calibration number: (method, figures). What was stored before is replaced."""
    table = schema.calibration_figures
    writer.flush()  # the figures point at rows that may still be waiting
    ids = list(figures)
    for start in range(0, len(ids), _MANY):
        writer.connection.execute(delete(table).where(table.c.calibration_id.in_(ids[start : start + _MANY])))
    made = [
        {"calibration_id": key, "method": method, "figures": json.dumps(values, allow_nan=False)}
        for key, (method, values) in figures.items()
    ]
    if made:
        writer.connection.execute(insert(table), made)


def newest_id(connection: Connection, sheet: Sheet) -> int:
    return connection.execute(select(func.max(schema.tables[sheet.name].c.id))).scalar() or 0


def limits(connection: Connection, analyte_id: int | None = None) -> list[Row]:
    """All of them, or those that may hold for the analyte."""
    own = schema.tables[sheets.LIMITS.name].c.analyte_id
    where = () if analyte_id is None else (or_(own.is_(None), own == analyte_id),)
    return rows(connection, sheets.LIMITS, *where, order=("rule", "id"))


def grew_from(connection: Connection, seq: int, head: str) -> bool:
    """Whether the record was once in that state, so that what was said of it then was said of this one."""
    table = schema.journal
    found = connection.execute(select(table.c.hash).where(table.c.seq == seq)).scalar()
    return head == (FIRST_HASH if seq == 0 else found)


def lives_seen(connection: Connection, moment: datetime) -> dict[str, str]:
    """Per probe that isn't retired by then, by label: how many events of each kind it has, and the newest's number."""
    electrodes = schema.tables["electrodes"]
    live = select(electrodes.c.id, electrodes.c.electrode).where(electrodes.c.struck.is_(None))
    labels = {row.id: row.electrode for row in connection.execute(live.order_by(electrodes.c.electrode))}
    found: dict[int, list[str]] = {row_id: [] for row_id in labels}
    for sheet in EVENTS:
        table = schema.tables[sheet.name]
        counted = select(table.c.electrode_id, func.count(), func.max(table.c.id)).where(table.c.struck.is_(None))
        for electrode_id, count, newest in connection.execute(counted.group_by(table.c.electrode_id)):
            if electrode_id in found:
                found[electrode_id].append(f"{sheet.name} {count} {newest}")
    table = schema.tables[sheets.RETIREMENTS.name]
    ended = select(table.c.electrode_id).where(table.c.struck.is_(None), table.c.at <= moment)
    gone = set(connection.execute(ended).scalars())
    return {labels[row_id]: ", ".join(said) for row_id, said in found.items() if row_id not in gone}
