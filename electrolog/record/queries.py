"""What is asked of the record. Status and exposure are derived here from events; nowhere are they stored."""

from __future__ import annotations

import json
from collections import defaultdict
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass
from datetime import UTC, date, datetime, timedelta
from typing import Any

from sqlalchemy import Connection, Select, delete, func, insert, or_, select

from electrolog.record import schema, sheets
from electrolog.record.journal import FIRST_HASH, Writer
from electrolog.record.readable import Row, readable, rows
from electrolog.record.sheets import EVENTS, Sheet

_MANY = 500  # engines limit how many parameters one statement takes; above this a whole table is read instead


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
        .order_by(table.c.electrode)
    )
    if labels:
        query = query.where(table.c.electrode.in_(labels))
    return [dict(row) for row in connection.execute(query).mappings()]


def events(
    connection: Connection, electrode_ids: Sequence[int] | None = None, of: Iterable[Sheet] = EVENTS
) -> dict[str, list[Event]]:
    """Events by probe label, each list in the order of time; of all probes, or of those named."""
    lives: dict[str, list[Event]] = defaultdict(list)
    for sheet in of:
        time = sheet.time_column or "at"
        query = _of_electrodes(readable(sheet), sheet, electrode_ids)
        for row in connection.execute(query).mappings():
            lives[row["electrode"]].append(Event(row[time], sheet, dict(row)))
    for life in lives.values():
        life.sort(key=lambda event: (event.at, EVENTS.index(event.sheet)))
    return dict(lives)


def calibrations(
    connection: Connection,
    electrode_ids: Sequence[int] | None = None,
    analyte_id: int | None = None,
    waveform_id: int | None = None,
) -> list[Calibration]:
    """Calibrations with points and stored figures, oldest first."""
    table = schema.tables["calibrations"]
    query = _of_electrodes(readable(sheets.CALIBRATIONS), sheets.CALIBRATIONS, electrode_ids)
    if analyte_id is not None:
        query = query.where(table.c.analyte_id == analyte_id)
    if waveform_id is not None:
        query = query.where(table.c.waveform_id == waveform_id)
    return _with_points(connection, query)


def calibrations_by_id(connection: Connection, ids: Sequence[int]) -> list[Calibration]:
    return _with_points(connection, readable(sheets.CALIBRATIONS).where(schema.tables["calibrations"].c.id.in_(ids)))


def electrodes_calibrated_on(connection: Connection, days: Iterable[date]) -> list[int]:
    """Which probes were calibrated on any of these days (UTC), by number."""
    table = schema.tables["calibrations"]
    spans = [datetime(day.year, day.month, day.day, tzinfo=UTC) for day in days]
    on = [table.c.at.between(start, start + timedelta(days=1)) for start in spans]
    if not on:
        return []
    found = connection.execute(select(table.c.electrode_id).where(or_(*on), table.c.struck.is_(None)).distinct())
    return [row.electrode_id for row in found]


def calibrations_on_standard(connection: Connection, standard_id: int) -> list[Calibration]:
    table = schema.tables["calibrations"]
    return _with_points(connection, readable(sheets.CALIBRATIONS).where(table.c.standard_id == standard_id))


def _with_points(connection: Connection, query: Select[Any]) -> list[Calibration]:
    table, figures = schema.tables["calibrations"], schema.calibration_figures
    found = [dict(row) for row in connection.execute(query.order_by(table.c.at, table.c.calibration)).mappings()]
    ids = [row["id"] for row in found]
    points = _points(connection, ids)
    kept = {
        row.calibration_id: json.loads(row.figures)
        for row in connection.execute(_among(select(figures), figures.c.calibration_id, ids))
    }
    return [Calibration(row, tuple(points.get(row["id"], ())), kept.get(row["id"])) for row in found]


def _points(connection: Connection, calibration_ids: Sequence[int]) -> dict[int, list[tuple[float, float]]]:
    table = schema.tables["calibration_points"]
    query = select(table.c.calibration_id, table.c.concentration_um, table.c.current_na).where(table.c.struck.is_(None))
    query = _among(query, table.c.calibration_id, calibration_ids)
    found: dict[int, list[tuple[float, float]]] = defaultdict(list)
    for calibration_id, concentration, current in connection.execute(
        query.order_by(table.c.calibration_id, table.c.ordinal)
    ):
        found[calibration_id].append((concentration, current))
    return found


def _of_electrodes(query: Any, sheet: Sheet, electrode_ids: Sequence[int] | None) -> Any:
    if electrode_ids is None:
        return query
    return _among(query, schema.tables[sheet.name].c.electrode_id, electrode_ids)


def _among(query: Any, column: Any, ids: Sequence[int]) -> Any:
    return query.where(column.in_(ids)) if len(ids) <= _MANY else query


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


def limits(connection: Connection) -> list[Row]:
    return rows(connection, sheets.LIMITS, order=("rule", "id"))


@dataclass(frozen=True)
class Seen:
    """How much of the record a fit has seen: its calibrations, how many and the newest one's number, and the newest
    correction's entry.
    """

    readings: int
    newest: int
    correction: int


@dataclass(frozen=True)
class KeptFit:
    method: str
    fingerprint: str
    seen: Seen
    made_at: datetime
    fit: dict[str, Any]


def to_be_seen(connection: Connection, analyte_id: int) -> Seen:
    """What a fit made now would see."""
    calibrations, journal = schema.tables["calibrations"], schema.journal
    live = calibrations.c.analyte_id == analyte_id, calibrations.c.struck.is_(None)
    count, newest = connection.execute(select(func.count(), func.max(calibrations.c.id)).where(*live)).one()
    correction = select(func.max(journal.c.seq)).where(schema.CORRECTIONS)
    return Seen(count, newest or 0, connection.execute(correction).scalar() or 0)


def grew_from(connection: Connection, seq: int, head: str) -> bool:
    """Whether the record was once in that state, so that what was said of it then was said of this one."""
    table = schema.journal
    found = connection.execute(select(table.c.hash).where(table.c.seq == seq)).scalar()
    return head == (FIRST_HASH if seq == 0 else found)


def kept_fit(connection: Connection, analyte_id: int) -> KeptFit | None:
    table = schema.kept_fits
    row = connection.execute(select(table).where(table.c.analyte_id == analyte_id)).first()
    if row is None:
        return None
    seen = Seen(row.seen_readings, row.seen_newest or 0, row.seen_correction)
    return KeptFit(row.method, row.fingerprint, seen, row.made_at, json.loads(row.fit))


def keep_fit(
    writer: Writer, analyte_id: int, method: str, fingerprint: str, seen: Seen, fit: Mapping[str, Any]
) -> None:
    table = schema.kept_fits
    writer.connection.execute(delete(table).where(table.c.analyte_id == analyte_id))
    row = {
        "analyte_id": analyte_id,
        "method": method,
        "fingerprint": fingerprint,
        "seen_readings": seen.readings,
        "seen_newest": seen.newest,
        "seen_correction": seen.correction,
        "made_at": writer.at,
        "fit": json.dumps(fit, allow_nan=False),
    }
    writer.connection.execute(insert(table), [row])


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
