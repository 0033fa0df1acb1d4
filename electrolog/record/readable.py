"""Rows as people read them: links by name instead of number."""

from __future__ import annotations

from collections.abc import Iterable
from typing import Any

from sqlalchemy import ColumnElement, Connection, FromClause, Select, Table, select

from electrolog.record import columns as kinds
from electrolog.record import schema
from electrolog.record.sheets import BY_NAME, Sheet

Row = dict[str, Any]


def readable(sheet: Sheet) -> Select[Any]:
    """A query for the live rows of a sheet, with its column names; `id` and the like come along.

    The columns of the sheet's own table stay reachable as schema.tables[sheet.name].c for a where().
    """
    table = schema.tables[sheet.name]
    chosen: list[ColumnElement[Any]] = [table.c[name] for name in ("id", "ordinal") if name in table.c]
    joined: FromClause = table
    for column in sheet.columns:
        if isinstance(column, kinds.Link):
            target: Table = schema.tables[column.to].alias(f"named_{column.name}")  # type: ignore[assignment]
            joined = joined.outerjoin(target, table.c[schema.column_name(column)] == target.c.id)
            chosen.append(target.c[BY_NAME[column.to].key[0]].label(column.name))
        else:
            chosen.append(table.c[column.name])
    return select(*chosen).select_from(joined).where(table.c.struck.is_(None))


def rows(connection: Connection, sheet: Sheet, *where: ColumnElement[bool], order: Iterable[str] = ()) -> list[Row]:
    table = schema.tables[sheet.name]
    query = readable(sheet).where(*where).order_by(*[table.c[name] for name in order])
    return [dict(row) for row in connection.execute(query).mappings()]


def row_by_id(connection: Connection, sheet: Sheet, row_id: int) -> Row:
    return rows(connection, sheet, schema.tables[sheet.name].c.id == row_id)[0]
