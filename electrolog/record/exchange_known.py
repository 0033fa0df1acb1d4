"""What the record holds already of a sheet that is being imported."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Callable
from dataclasses import dataclass, field
from typing import Any

from sqlalchemy import Connection, func, select

from electrolog.record import builtin, schema, sheets
from electrolog.record.sheets import Sheet

Values = tuple[Any, ...]  # one row as its table keeps it, in the order of the sheet's columns
Point = tuple[float, float]


@dataclass
class Known:
    """The rows of one sheet, live and struck, by the key that tells live rows apart."""

    live: dict[Any, tuple[int, Values]] = field(default_factory=dict)
    struck: dict[Any, list[tuple[int, Values]]] = field(default_factory=lambda: defaultdict(list))
    untouched: set[int] = field(default_factory=set)  # built-in rows that nobody has amended


def known_rows(connection: Connection, sheet: Sheet) -> Known:
    table = schema.tables[sheet.name]
    key = key_of(sheet)
    known = Known(untouched=_untouched(connection, sheet))
    columns = [table.c[schema.column_name(column)] for column in sheet.columns]
    for row_id, struck, *rest in connection.execute(select(table.c.id, table.c.struck, *columns)):
        values = tuple(rest)
        if struck is None:
            known.live[key(values)] = (row_id, values)
        else:
            known.struck[key(values)].append((row_id, values))
    return known


def key_of(sheet: Sheet) -> Callable[[Values], Any]:
    """The key of a row. Labels are folded: two that differ by case alone are one to a tired eye, and one word."""
    places = [list(sheet.by_name).index(name) for name in sheet.key]
    if is_labelled(sheet):
        place = places[0]
        return lambda values: values[place].casefold()
    if sheet is sheets.TERMS:
        return lambda values: (values[0], values[1].casefold())
    return lambda values: tuple(values[place] for place in places)


def is_labelled(sheet: Sheet) -> bool:
    return len(sheet.key) == 1 and (sheet.key[0] != "electrode" or sheet is sheets.ELECTRODES)


def _untouched(connection: Connection, sheet: Sheet) -> set[int]:
    if sheet not in (sheets.ANALYTES, sheets.WAVEFORMS):
        return set()
    table = schema.journal
    query = (
        select(table.c.row_id)
        .where(table.c.sheet == sheet.name)
        .group_by(table.c.row_id)
        .having(func.count() == 1, func.min(table.c.reason) == builtin.REASON)
    )
    return set(connection.execute(query).scalars())


@dataclass
class StoredPoints:
    """The points of the calibrations in the record, in their order."""

    live: dict[int, list[Point]] = field(default_factory=lambda: defaultdict(list))
    every: dict[int, list[Point]] = field(default_factory=lambda: defaultdict(list))


def stored_points(connection: Connection) -> StoredPoints:
    table = schema.tables["calibration_points"]
    stored = StoredPoints()
    query = select(table.c.calibration_id, table.c.concentration_um, table.c.current_na, table.c.struck)
    for calibration_id, concentration, current, struck in connection.execute(
        query.order_by(table.c.calibration_id, table.c.ordinal)
    ):
        stored.every[calibration_id].append((concentration, current))
        if struck is None:
            stored.live[calibration_id].append((concentration, current))
    return stored
