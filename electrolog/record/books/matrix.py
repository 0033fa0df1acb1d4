"""Books with a column for each probe: rows are concentrations or days, and the headings are the probes' labels."""

from __future__ import annotations

import re
from collections.abc import Callable, Collection, Iterator, Mapping
from dataclasses import dataclass
from datetime import date

from electrolog.record.books.grid import Content, Grid, shown
from electrolog.record.books.headings import Meaning

Understand = Callable[[str], Meaning | None]
KEYS = ("concentration", "day", "electrode")  # "Probe" in the corner of a table whose rows are days
BESIDE = ("day", "time", "stage", "analyte", "by", "rig", "medium", "temperature", "standard", "note", "derived")
_DAY = re.compile(r"\d{1,4}[./-]\d{1,2}[./-]\d{1,4}|\d{1,2}\.? \w{3,9}\.? '?\d{2,4}")
_NUMERIC = re.compile(r"[~<>≈±+\-\s\d.,eE]*\d[~<>≈±+\-\s\d.,eE]*")
_LOOK = re.compile(r"\d+")
LONGEST_LABEL = 30


@dataclass(frozen=True)
class Matrix:
    """The column of the rows' keys with what it holds, the probes' columns, and those that say more of each row.

    `certain`: something in the book says that the columns are probes.
    """

    key: int
    holds: str
    probes: tuple[tuple[int, str], ...]
    beside: tuple[int, ...]
    certain: bool


def matrix(
    grid: Grid, row: int, texts: Mapping[int, str], above: Callable[[int], str], understand: Understand
) -> Matrix | None:
    """None where the row heads no such table. `texts`: its headings by column; `above`: what stands over a column."""
    known = {column: found for column, text in texts.items() if (found := understand(text)) is not None}
    key = _key(grid, row, known) if len(known) < len(texts) else None
    if key is None:
        return None
    probes = tuple((column, text) for column, text in texts.items() if column != key and column not in known)
    beside = tuple(column for column, found in known.items() if column != key and found.field in BESIDE)
    labels = {text.casefold() for _, text in probes}
    if len(probes) < 2 or len(labels) < len(probes) or len(probes) + len(beside) + (key in known) < len(texts):
        return None
    over = [understand(above(column)) for column, _ in probes]
    headed = all(found is not None and found.field == "electrode" for found in over)
    certain = headed or (key in known and known[key].field == "electrode")
    filled = [column for column, _ in probes if any(cell is not None for cell in _below(grid, row, column))]
    if not (certain or _look_alike(labels)) or not filled:
        return None
    if not all(_holds_numbers(grid, row, column) for column in filled):
        return None
    holds = "concentration" if key in known and known[key].field == "concentration" else "day"
    return Matrix(key, holds, probes, beside, certain)


def _key(grid: Grid, row: int, known: dict[int, Meaning]) -> int | None:
    for column, found in known.items():
        if found.field in KEYS:
            fits = found.field == "concentration" or _holds_days(grid, row, column)
            return column if fits else None
    blank = next((column for column in range(2) if not grid.text(row, column)), None)
    return blank if blank is not None and _holds_days(grid, row, blank) else None


def _look_alike(labels: Collection[str]) -> bool:
    """Labels of one lab have a stem and a number, or are a letter or two; numbers may be amounts."""
    if any(len(label) > LONGEST_LABEL or _NUMERIC.fullmatch(label) for label in labels):
        return False
    stems = {_LOOK.sub("#", label) for label in labels}
    return len(stems) <= 2 and all("#" in stem or len(stem) <= 2 for stem in stems)


def _below(grid: Grid, row: int, column: int) -> Iterator[Content]:
    for number in range(row + 1, len(grid.rows)):
        if not grid.filled(number):
            return
        cell = grid.at(number, column)
        if cell is not None:
            yield cell


def _holds_days(grid: Grid, row: int, column: int) -> bool:
    cells = list(_below(grid, row, column))
    return bool(cells) and sum(_is_day(cell) for cell in cells) * 2 > len(cells)


def _is_day(cell: Content) -> bool:
    return isinstance(cell, date) or (isinstance(cell, str) and _DAY.match(cell) is not None)


def _holds_numbers(grid: Grid, row: int, column: int) -> bool:
    """Most of its cells: the others may say why there is none."""
    cells = list(_below(grid, row, column))
    numeric = [isinstance(cell, float) or bool(_NUMERIC.fullmatch(shown(cell))) for cell in cells]
    return sum(numeric) * 2 > len(cells)
