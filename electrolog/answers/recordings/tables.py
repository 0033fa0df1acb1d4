"""What is put beside a recording, as plain tables: each column with its meaning and its unit."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from datetime import date, datetime
from typing import Any

from electrolog.clock import iso_utc
from electrolog.record.columns import Column as SheetColumn
from electrolog.record.columns import Number
from electrolog.record.sheet import Sheet


@dataclass(frozen=True)
class Column:
    """`numeric`: floats, NaN where unknown; otherwise text, empty where unknown. The unit stands in the name."""

    name: str
    about: str
    values: tuple[Any, ...]
    numeric: bool


@dataclass(frozen=True)
class Table:
    name: str
    about: str
    columns: tuple[Column, ...]

    def __len__(self) -> int:
        return len(self.columns[0].values)


@dataclass(frozen=True)
class Meaning:
    about: str
    numeric: bool = False


def table(name: str, about: str, meanings: Mapping[str, Meaning], rows: Sequence[Mapping[str, Any]]) -> Table:
    """`meanings`: every column in its order. What a row doesn't say is unknown."""
    columns = [_column(key, meaning, [row.get(key) for row in rows]) for key, meaning in meanings.items()]
    return Table(name, about, tuple(columns))


def number(about: str) -> Meaning:
    return Meaning(about, numeric=True)


def meanings_of(sheet: Sheet, *names: str) -> dict[str, Meaning]:
    """Columns of the record's own, as its dictionary says them."""
    return {name: _meaning(sheet.by_name[name]) for name in names}


def _meaning(column: SheetColumn) -> Meaning:
    sign = column.unit.sign if isinstance(column, Number) else ""
    return Meaning(f"{column.about}, in {sign}" if sign else column.about, isinstance(column, Number))


def _column(name: str, meaning: Meaning, values: Sequence[Any]) -> Column:
    if meaning.numeric:
        numbers = tuple(float("nan") if value is None else float(value) for value in values)
        return Column(name, meaning.about, numbers, True)
    return Column(name, meaning.about, tuple(map(_text, values)), False)


def _text(value: Any) -> str:
    if isinstance(value, date):
        return iso_utc(value) if isinstance(value, datetime) else value.isoformat()
    return "" if value is None else str(value)
