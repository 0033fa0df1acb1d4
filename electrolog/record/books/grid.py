"""A book as the reader sees it: sheets of cells, each with a place that a person can find again."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from dataclasses import dataclass, field
from datetime import date, datetime, time
from functools import cached_property

Content = str | float | bool | datetime | date | time | None
Spot = tuple[int, int]  # row and column, counted from 0


@dataclass(frozen=True)
class Marks:
    """What a cell says beside its value; none of it has a meaning until somebody gives it one."""

    struck: bool = False
    colour: str = ""
    comment: str = ""


@dataclass
class Grid:
    """One sheet; empty cells are None. `spans` leads from every cell of a merged range to its first."""

    name: str
    rows: list[list[Content]]
    spans: Mapping[Spot, Spot] = field(default_factory=dict)
    marks: Mapping[Spot, Marks] = field(default_factory=dict)
    hidden: bool = False
    turned: bool = False  # rows are the sheet's columns; places are still told as in the sheet

    def turn(self) -> Grid:
        """For a sheet that has its headings down the first column."""
        turned = [[self._cell(row, column) for row in range(len(self.rows))] for column in range(self.width)]
        spans = {_swapped(spot): _swapped(first) for spot, first in self.spans.items()}
        marks = {_swapped(spot): mark for spot, mark in self.marks.items()}
        return Grid(self.name, tidy(turned), spans, marks, self.hidden, not self.turned)

    def _cell(self, row: int, column: int) -> Content:
        return self.rows[row][column] if column < len(self.rows[row]) else None

    def at(self, row: int, column: int) -> Content:
        """The cell's value, of a merged cell that of its range."""
        row, column = self.spans.get((row, column), (row, column))
        return self.rows[row][column] if row < len(self.rows) and column < len(self.rows[row]) else None

    def text(self, row: int, column: int) -> str:
        return shown(self.at(row, column))

    def own_text(self, row: int, column: int) -> str:
        """Empty for all of a merged range but its first cell."""
        return "" if self.spans.get((row, column), (row, column)) != (row, column) else self.text(row, column)

    def filled(self, row: int) -> list[int]:
        """The columns of a row that hold something."""
        return [column for column, value in enumerate(self.rows[row]) if value is not None]

    def place(self, row: int, column: int) -> str:
        return f"{self.name}!{cell_name(column, row) if self.turned else cell_name(row, column)}"

    @cached_property
    def width(self) -> int:
        return max((len(row) for row in self.rows), default=0)


@dataclass(frozen=True)
class Book:
    """A file's sheets, its name, and the SHA-256 of its bytes."""

    name: str
    fingerprint: str
    grids: tuple[Grid, ...]
    notes: tuple[str, ...] = ()  # what couldn't be looked at


def cell_name(row: int, column: int) -> str:
    """(0, 27) -> 'AB1'."""
    letters = ""
    column += 1
    while column:
        column, rest = divmod(column - 1, 26)
        letters = chr(65 + rest) + letters
    return f"{letters}{row + 1}"


def shown(value: Content) -> str:
    """As one would read it in the cell."""
    if value is None:
        return ""
    if isinstance(value, float):
        return repr(value).removesuffix(".0")
    if isinstance(value, datetime):
        return value.isoformat(sep=" ", timespec="minutes")
    if isinstance(value, date | time):
        return value.isoformat()
    return " ".join(str(value).split())


def _swapped(spot: Spot) -> Spot:
    return spot[1], spot[0]


def tidy(rows: Iterator[list[Content]] | list[list[Content]]) -> list[list[Content]]:
    """Without trailing emptiness; blank text is nothing."""
    tidied = [_trimmed([_blank_is_none(value) for value in row]) for row in rows]
    while tidied and not tidied[-1]:
        tidied.pop()
    return tidied


def _blank_is_none(value: Content) -> Content:
    if isinstance(value, str):
        return value.strip() or None
    return float(value) if isinstance(value, int) and not isinstance(value, bool) else value


def _trimmed(row: list[Content]) -> list[Content]:
    while row and row[-1] is None:
        row.pop()
    return row
