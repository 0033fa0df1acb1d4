"""What a cohort's fit had seen, and what has happened to that cohort since, whatever the others did."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

from sqlalchemy import ColumnElement, Connection, and_, exists, func, or_, select

from electrolog.record import schema, sheets

_OF_ALL = (sheets.TERMS.name, sheets.WAVEFORMS.name)  # words that any cohort may use


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


def to_be_seen(connection: Connection, analyte_id: int) -> Seen:
    """What a fit made now would see."""
    calibrations, journal = schema.tables["calibrations"], schema.journal
    live = calibrations.c.analyte_id == analyte_id, calibrations.c.struck.is_(None)
    count, newest = connection.execute(select(func.count(), func.max(calibrations.c.id)).where(*live)).one()
    correction = select(func.max(journal.c.seq)).where(schema.CORRECTIONS)
    return Seen(count, newest or 0, connection.execute(correction).scalar() or 0)


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
