"""The kept fit of a cohort: what it had seen, and what has happened to that cohort since, whatever the others did."""

from __future__ import annotations

import hashlib
import json
from collections.abc import Collection, Mapping, Sequence
from dataclasses import dataclass
from datetime import datetime
from typing import Any

from sqlalchemy import ColumnElement, Connection, and_, exists, func, or_, select

from electrolog.errors import DataError
from electrolog.record import schema, sheets
from electrolog.record.journal import Writer, insert_columns

_OF_ALL = (sheets.TERMS.name, sheets.WAVEFORMS.name)  # words that any cohort may use
MOST_NAMED = 500  # units in one question; whoever asks about more is given all
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


@dataclass(frozen=True)
class Sealed:
    """A fit ready to be kept: its row, and each unit's. Made beforehand, or everybody would wait for it to write."""

    seen: Seen
    row: Mapping[str, Any]
    units: Mapping[str, str]


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


def content(connection: Connection, analyte_id: int, units: Collection[str] | None = None) -> dict[str, Any]:
    """The kept fit itself, as plain data: what is shared, and the named units' own, of all where None are named.

    Raises DataError where it isn't as it was kept: a bit that flipped would give another forecast, and nothing would
    show it.
    """
    table, own = schema.kept_fits, schema.kept_fit_units.c
    row = connection.execute(select(table).where(table.c.analyte_id == analyte_id)).mappings().one()
    query = select(own.unit, own.fit).where(own.analyte_id == analyte_id)
    if units is not None and len(units) <= MOST_NAMED:
        query = query.where(own.unit.in_(units))
    parts = connection.execute(query).all()
    if not _is_whole(connection, dict(row), parts):
        raise DataError("the kept fit isn't what was kept", "fit the cohort again")
    return {
        "shared": json.loads(_text(row["fit"])),
        "units": {part.unit: json.loads(_text(part.fit)) for part in parts},
    }


def changed(connection: Connection, method: str) -> list[str]:
    """The analytes whose fit, kept by this method, isn't as it was kept."""
    table, own = schema.kept_fits, schema.kept_fit_units.c
    analytes = schema.tables[sheets.ANALYTES.name].c
    rows = connection.execute(select(table).where(table.c.method == method)).mappings().all()
    found = []
    for row in rows:
        parts = connection.execute(select(own.unit, own.fit).where(own.analyte_id == row["analyte_id"])).all()
        if not _is_whole(connection, dict(row), parts):
            name = select(analytes.analyte).where(analytes.id == row["analyte_id"])
            found.append(str(connection.execute(name).scalar()))
    return found


def sealed(method: str, fingerprint: str, seen: Seen, fit: Mapping[str, Any]) -> Sealed:
    """fit: what all units share under "shared", each one's own under "units" by its label."""
    row = {
        "method": method,
        "fingerprint": fingerprint,
        "seen_readings": seen.readings,
        "seen_newest": seen.newest,
        "seen_correction": seen.correction,
    }
    shared = _hashed(_said(row, len(fit["units"])), json.dumps(fit["shared"], allow_nan=False))
    own = {unit: json.dumps(part, allow_nan=False) for unit, part in fit["units"].items()}
    units = {unit: _hashed(_hash(shared) + unit, text) for unit, text in own.items()}
    return Sealed(seen, row | {"fit": shared}, units)


def keep_fit(writer: Writer, analyte_id: int, fit: Sealed) -> None:
    """In place of the one kept before; of two machines that fitted at once, what had seen more is kept."""
    before = kept_fit(writer.connection, analyte_id)
    if before is not None and before.method == fit.row["method"] and not _as_much(fit.seen, before.seen):
        return
    for table in (schema.kept_fits, schema.kept_fit_units):
        writer.connection.execute(table.delete().where(table.c.analyte_id == analyte_id))
    row = {"analyte_id": analyte_id, "made_at": writer.at, **fit.row}
    writer.connection.execute(schema.kept_fits.insert().values(row))
    if fit.units:
        of: list[Any] = [analyte_id] * len(fit.units)
        columns = {"analyte_id": of, "unit": [*fit.units], "fit": [*fit.units.values()]}
        insert_columns(writer.connection, schema.kept_fit_units, columns)


def _said(row: Mapping[str, Any], units: int) -> str:
    """What the fit's own hash is also over: what it has seen, and of how many units it holds something."""
    return json.dumps([*(row[name] for name in ("method", "fingerprint", *_SEEN)), units])


def _hashed(said: str, text: str) -> str:
    """The text after its own hash, and that of what stands elsewhere and belongs to it."""
    return hashlib.sha256(f"{said}{text}".encode()).hexdigest() + text


def _hash(kept: str) -> str:
    return kept[:64]


def _text(kept: str) -> str:
    return kept[64:]


def _is_whole(connection: Connection, row: Mapping[str, Any], parts: Sequence[Any]) -> bool:
    own = schema.kept_fit_units.c
    count = connection.execute(select(func.count()).where(own.analyte_id == row["analyte_id"])).scalar_one()
    shared = row["fit"]
    return shared == _hashed(_said(row, count), _text(shared)) and all(
        part.fit == _hashed(_hash(shared) + part.unit, _text(part.fit)) for part in parts
    )


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
