"""Writing what an import fills in: journalled like any amendment; no derived figure outlives what it was made from."""

from __future__ import annotations

from typing import Any

from sqlalchemy import delete, select, update

from electrolog.record import schema, sheets
from electrolog.record.journal import Writer
from electrolog.record.sheets import Sheet

Changes = dict[str, tuple[Any, Any]]  # column -> (before, after)


def write_amendment(writer: Writer, sheet: Sheet, row_id: int, changes: Changes) -> None:
    columns = {name: schema.column_name(sheet.by_name[name]) for name in changes}
    before = {columns[name]: old for name, (old, _) in changes.items()}
    after = {columns[name]: new for name, (_, new) in changes.items()}
    writer.flush()  # a link may lead to a row that waits
    table = schema.tables[sheet.name]
    writer.connection.execute(update(table).where(table.c.id == row_id).values(after))
    writer.note("amend", sheet.name, row_id, {"before": before, "after": after})
    _drop_figures(writer, sheet, row_id)


def _drop_figures(writer: Writer, sheet: Sheet, row_id: int) -> None:
    """They are made anew from the rows when they are next asked for."""
    figures, calibrations = schema.calibration_figures, schema.tables["calibrations"]
    if sheet is sheets.CALIBRATIONS:
        writer.connection.execute(delete(figures).where(figures.c.calibration_id == row_id))
    elif sheet is sheets.STANDARDS:
        resting = select(calibrations.c.id).where(calibrations.c.standard_id == row_id)
        writer.connection.execute(delete(figures).where(figures.c.calibration_id.in_(resting)))
