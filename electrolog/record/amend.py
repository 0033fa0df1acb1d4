"""Correcting: an amendment or a strike keeps the old value, who, when and why. Nothing is overwritten unsaid."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

from sqlalchemy import ColumnElement, Connection, func, select, update

from electrolog.errors import InputError
from electrolog.record import columns as kinds
from electrolog.record import earlier, entry, schema, sheets
from electrolog.record.builtin import REASON as BUILT_IN
from electrolog.record.columns import Value
from electrolog.record.journal import Writer
from electrolog.record.sheets import SHEETS, Sheet

Change = dict[str, tuple[Any, Any]]


def amend(writer: Writer, sheet: Sheet, row_id: int, values: Mapping[str, Value], ordinal: int | None = None) -> Change:
    """Sets columns of one row (None: unknown) and returns what changed, column -> (before, after).

    `ordinal` names a point of calibration `row_id`. Raises InputError for a value that can't be taken, a row
    that has been struck, no reason, or nothing to change.
    """
    _require_reason(writer)
    before = _live_row(writer, sheet, row_id, ordinal)
    after = {**before, **_resolved_part(writer, sheet, values)}
    changed = {name: (before[name], after[name]) for name in after if after[name] != before[name]}
    if not changed:
        raise InputError("nothing to amend: the row holds these values already")
    _check_amended(writer, sheet, row_id, before, after)
    change: dict[str, Any] = {
        "before": {name: old for name, (old, _) in changed.items()},
        "after": {name: new for name, (_, new) in changed.items()},
    }
    writer.flush()
    statement = update(schema.tables[sheet.name]).where(_place(sheet, row_id, ordinal))
    writer.connection.execute(statement.values(change["after"]))
    writer.note("amend", sheet.name, row_id, change if ordinal is None else {**change, "ordinal": ordinal})
    return changed


def strike(writer: Writer, sheet: Sheet, row_id: int, ordinal: int | None = None) -> None:
    """Takes a row out of every answer; it stays in the database, with who, when and why in the journal."""
    _require_reason(writer)
    row = _live_row(writer, sheet, row_id, ordinal)
    _refuse_built_in(writer, sheet, row_id)
    _refuse_linked(writer, sheet, row_id)
    _refuse_word_in_use(writer, sheet, row)
    change: dict[str, Any] = {"before": entry.known(row)}
    seq = writer.note("strike", sheet.name, row_id, change if ordinal is None else {**change, "ordinal": ordinal})
    writer.flush()  # the row will point at this entry, so the entry has to be there first
    statement = update(schema.tables[sheet.name]).where(_place(sheet, row_id, ordinal))
    writer.connection.execute(statement.values(struck=seq))


def is_live(connection: Connection, sheet: Sheet, row_id: int) -> bool:
    table = schema.tables[sheet.name]
    query = select(table.c.id).where(table.c.id == row_id, table.c.struck.is_(None))
    return connection.execute(query).first() is not None


def _require_reason(writer: Writer) -> None:
    if not writer.reason.strip():
        raise InputError("a correction needs its reason; accepted: --why 'unit slip, read as uM'")
    kinds.checked_text(writer.reason, "reason", kinds.TEXT_LIMIT)


def _place(sheet: Sheet, row_id: int, ordinal: int | None) -> ColumnElement[bool]:
    table = schema.tables[sheet.name]
    if sheet is sheets.POINTS:
        return (table.c.calibration_id == row_id) & (table.c.ordinal == ordinal)
    return table.c.id == row_id


def _live_row(writer: Writer, sheet: Sheet, row_id: int, ordinal: int | None) -> dict[str, Any]:
    writer.flush()
    query = select(schema.tables[sheet.name]).where(_place(sheet, row_id, ordinal))
    row = writer.connection.execute(query).mappings().first()
    if row is None:
        raise InputError(f"there is no {sheet.one} {row_id if ordinal is None else f'number {ordinal}'}")
    if row["struck"] is not None:
        by = earlier.struck_by(writer.connection, row["struck"])
        raise InputError(f"this {sheet.one} was struck (journal entry {row['struck']}, {by}); accepted: a live one")
    return {name: value for name, value in row.items() if name not in ("id", "ordinal", "struck")}


def _resolved_part(writer: Writer, sheet: Sheet, values: Mapping[str, Value]) -> dict[str, Any]:
    part: dict[str, Any] = {}
    for name, value in values.items():
        column = sheet.by_name[name]
        part[schema.column_name(column)] = entry.resolved_value(sheet, column, value, writer.names)
    return part


def _check_amended(writer: Writer, sheet: Sheet, row_id: int, before: dict[str, Any], after: dict[str, Any]) -> None:
    entry.check_row(sheet, after, sheet is sheets.CALIBRATIONS and _count_points(writer, row_id) > 0)
    if sheet is sheets.POINTS and after["calibration_id"] != row_id:
        raise InputError(
            "calibration: a point stays with its calibration; accepted: strike it, and log it where it belongs"
        )
    entry.refuse_shared_name(sheet, after, writer.names, itself=row_id)
    key = [schema.column_name(sheet.by_name[name]) for name in sheet.key]
    if any(after[name] != before[name] for name in key):
        _refuse_word_in_use(writer, sheet, before)
        entry.refuse_double(writer, sheet, after)
        entry.refuse_lookalike(sheet, after, writer.names, itself=before[key[-1]])


def _count_points(writer: Writer, calibration_id: int) -> int:
    points = schema.tables["calibration_points"]
    query = select(func.count()).where(points.c.calibration_id == calibration_id, points.c.struck.is_(None))
    return writer.connection.execute(query).scalar_one()


def _refuse_built_in(writer: Writer, sheet: Sheet, row_id: int) -> None:
    table = schema.journal
    first = select(table.c.reason).where(table.c.sheet == sheet.name, table.c.row_id == row_id, table.c.action == "add")
    if writer.connection.execute(first).scalar() == BUILT_IN:
        raise InputError(f"a built-in {sheet.one} can't be struck; accepted: amend it")


def _refuse_linked(writer: Writer, sheet: Sheet, row_id: int) -> None:
    """A row that others rest on can't be taken from under them."""
    for other in SHEETS:
        if other is sheets.POINTS:  # points go with their calibration
            continue
        for column in other.columns:
            if isinstance(column, kinds.Link) and column.to == sheet.name:
                table = schema.tables[other.name]
                link = table.c[schema.column_name(column)]
                query = select(func.count()).where(link == row_id, table.c.struck.is_(None))
                count = writer.connection.execute(query).scalar_one()
                if count:
                    raise InputError(f"{count} {other.name} rest on this {sheet.one}; strike or amend those first")


def _refuse_word_in_use(writer: Writer, sheet: Sheet, row: dict[str, Any]) -> None:
    if sheet is not sheets.TERMS:
        return
    for other in SHEETS:
        for column in other.columns:
            if isinstance(column, kinds.Word) and column.kind == row["kind"]:
                table = schema.tables[other.name]
                query = select(func.count()).where(table.c[column.name] == row["term"], table.c.struck.is_(None))
                count = writer.connection.execute(query).scalar_one()
                if count:
                    raise InputError(f"{count} {other.name} use this word; amend those first")
