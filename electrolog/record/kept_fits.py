"""The kept fit of a cohort: what it had seen, and what has happened to that cohort since, whatever the others did."""

from __future__ import annotations

import hashlib
import json
from collections.abc import Mapping
from dataclasses import dataclass
from datetime import datetime
from typing import Any

from sqlalchemy import ColumnElement, Connection, and_, exists, func, or_, select

from electrolog.errors import DataError
from electrolog.record import schema, sheets
from electrolog.record.journal import Writer

_OF_ALL = (sheets.TERMS.name, sheets.WAVEFORMS.name)  # words that any cohort may use
_SEEN = ("seen_readings", "seen_newest", "seen_correction")


@dataclass(frozen=True)
class Seen:
    """How much a fit has seen: its cohort's calibrations, how many and the newest one's number, and the record's
    newest correction by its journal entry.
    """

    readings: int
    newest: int
    correction: int


@dataclass(frozen=True)
class Since:
    """readings: calibrations that came after the newest one seen. correction: the newest entry that corrected anything
    of the cohort, 0 where nothing was corrected.
    """

    readings: int
    correction: int


@dataclass(frozen=True)
class KeptFit:
    method: str
    fingerprint: str
    seen: Seen
    made_at: datetime


def to_be_seen(connection: Connection, analyte_id: int) -> Seen:
    """What a fit made now would see."""
    calibrations, journal = schema.tables["calibrations"], schema.journal
    live = calibrations.c.analyte_id == analyte_id, calibrations.c.struck.is_(None)
    count, newest = connection.execute(select(func.count(), func.max(calibrations.c.id)).where(*live)).one()
    correction = select(func.max(journal.c.seq)).where(schema.CORRECTIONS)
    return Seen(count, newest or 0, connection.execute(correction).scalar() or 0)


def kept_fit(connection: Connection, analyte_id: int) -> KeptFit | None:
    """Without the fit itself, which is large."""
    table = schema.kept_fits
    columns = [table.c[name] for name in ("method", "fingerprint", *_SEEN, "made_at")]
    row = connection.execute(select(*columns).where(table.c.analyte_id == analyte_id)).first()
    if row is None:
        return None
    seen = Seen(row.seen_readings, row.seen_newest or 0, row.seen_correction)
    return KeptFit(row.method, row.fingerprint, seen, row.made_at)


def content(connection: Connection, analyte_id: int) -> dict[str, Any]:
    """The kept fit itself, as plain data.

    Raises DataError where it isn't as it was kept: a bit that flipped would give another forecast, and nothing would
    show it.
    """
    table = schema.kept_fits
    row = connection.execute(select(table).where(table.c.analyte_id == analyte_id)).mappings().one()
    if not _is_whole(dict(row)):
        raise DataError("the kept fit isn't what was kept", "fit the cohort again")
    found: dict[str, Any] = json.loads(row["fit"])["fit"]
    return found


def changed(connection: Connection, method: str) -> list[str]:
    """The analytes whose fit, kept by this method, isn't as it was kept."""
    table, analytes = schema.kept_fits, schema.tables[sheets.ANALYTES.name]
    of = table.join(analytes, table.c.analyte_id == analytes.c.id)
    rows = connection.execute(select(table, analytes.c.analyte).select_from(of).where(table.c.method == method))
    return [row["analyte"] for row in rows.mappings() if not _is_whole(dict(row))]


def _sealed(row: Mapping[str, Any], fit: str) -> str:
    """JSON with the fit's own hash before it, and that of what says how much it has seen."""
    said = [row[name] for name in ("method", "fingerprint", *_SEEN)]
    digest = hashlib.sha256(f"{json.dumps(said)}{fit}".encode()).hexdigest()
    return f'{{"sha256": "{digest}", "fit": {fit}}}'


def _is_whole(row: Mapping[str, Any]) -> bool:
    kept = row["fit"]
    return bool(kept == _sealed(row, kept[len(_sealed(row, "")) - 1 : -1]))


def keep_fit(
    writer: Writer, analyte_id: int, method: str, fingerprint: str, seen: Seen, fit: Mapping[str, Any]
) -> None:
    """In place of the one kept before; of two machines that fitted at once, what had seen more is kept."""
    table = schema.kept_fits
    row = {
        "method": method,
        "fingerprint": fingerprint,
        "seen_readings": seen.readings,
        "seen_newest": seen.newest,
        "seen_correction": seen.correction,
        "made_at": writer.at,
    }
    row["fit"] = _sealed(row, json.dumps(fit, allow_nan=False))
    before = kept_fit(writer.connection, analyte_id)
    if before is None:
        writer.connection.execute(table.insert().values(analyte_id=analyte_id, **row))
    elif before.method != method or _as_much(seen, before.seen):
        writer.connection.execute(table.update().where(table.c.analyte_id == analyte_id).values(**row))


def _as_much(seen: Seen, before: Seen) -> bool:
    """A correction may have struck what was the newest, so it goes first."""
    return (seen.correction, seen.newest) >= (before.correction, before.newest)


def since(connection: Connection, analyte_id: int, seen: Seen) -> Since:
    """Counted from where the fit stopped reading, so that asking costs no more as the cohort and the record grow."""
    calibrations = schema.tables["calibrations"].c
    came = calibrations.analyte_id == analyte_id, calibrations.struck.is_(None), calibrations.id > seen.newest
    readings = connection.execute(select(func.count()).where(*came)).scalar_one()
    return Since(readings, _corrected(connection, analyte_id, seen.correction))


def _corrected(connection: Connection, analyte_id: int, after: int) -> int:
    journal = schema.journal.c
    touches = or_(journal.sheet.in_(_OF_ALL), _moved(), *_touching(analyte_id))
    newest = select(func.max(journal.seq)).where(schema.CORRECTIONS, journal.seq > after, touches)
    return connection.execute(newest).scalar() or 0


def _moved() -> ColumnElement[bool]:
    """From one probe, analyte or batch to another: whose it was before, the row no longer says."""
    journal = schema.journal.c
    links = ('%"electrode_id":%', '%"analyte_id":%', '%"batch_id":%')
    return and_(journal.action == "amend", or_(*[journal.change.like(link) for link in links]))


def _touching(analyte_id: int) -> list[ColumnElement[bool]]:
    """Per sheet: whether the corrected row, struck or not, bears on a calibration with the analyte."""
    corrected, tables = schema.journal.c, schema.tables
    calibrations, electrodes = tables["calibrations"].c, tables["electrodes"].c

    def measured(*where: ColumnElement[bool]) -> Any:
        return exists().where(calibrations.analyte_id == analyte_id, *where)

    def of(sheet: sheets.Sheet, *where: ColumnElement[bool]) -> ColumnElement[bool]:
        return and_(corrected.sheet == sheet.name, *where)

    own = calibrations.id == corrected.row_id
    found = [
        of(sheets.ANALYTES, corrected.row_id == analyte_id),
        of(sheets.CALIBRATIONS, measured(own)),
        of(sheets.POINTS, measured(own)),
        of(sheets.STANDARDS, measured(calibrations.standard_id == corrected.row_id)),
        of(sheets.ELECTRODES, measured(calibrations.electrode_id == corrected.row_id)),
        of(
            sheets.BATCHES,
            measured(calibrations.electrode_id == electrodes.id, electrodes.batch_id == corrected.row_id),
        ),
    ]
    for sheet in sheets.EVENTS:
        event = tables[sheet.name].c
        if sheet not in (sheets.CALIBRATIONS, sheets.STANDARDS):
            probes = measured(calibrations.electrode_id == event.electrode_id, event.id == corrected.row_id)
            found.append(of(sheet, probes))
    return found
