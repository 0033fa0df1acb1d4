"""One heading row: what stands in the row above it too, and which labelled cells there are facts and no headings."""

from __future__ import annotations

import re
from collections.abc import Callable, Iterator
from dataclasses import dataclass
from functools import partial

from electrolog.record.books.grid import Content, Grid, Spot
from electrolog.record.books.headings import Meaning

BARE_STAGE = re.compile(r"pre|post|before|after", re.IGNORECASE)
_KEY_VALUE = re.compile(r"([^:]{1,40}):\s*(\S.*)")
_STAGE = re.compile(r"\b(pre|post|before|after)\b", re.IGNORECASE)
_NUMBER = re.compile(r"\d+([.,]\d+)?")
_DIGIT = re.compile(r"\d")
Understand = Callable[[str], Meaning | None]


@dataclass(frozen=True)
class Heading:
    column: int
    text: str


@dataclass(frozen=True)
class Fact:
    """A labelled cell beside or above a table, such as `Probe: K-07`."""

    heading: str
    value: Content
    spot: Spot


def headings_of(grid: Grid, row: int, understand: Understand) -> tuple[Heading, ...]:
    texts, over = [], groups(grid, row, understand)
    for column in grid.filled(row) + [c for c in range(grid.width) if grid.spans.get((row, c), (row, c))[0] < row]:
        text = grid.text(row, column)
        if text and len(text) <= 80:
            texts.append(Heading(column, _grouped(over(column), text, understand)))
    if texts and row and _is_grouping(grid, row - 1):  # what needs no second row is written in the first alone
        alone = [column for column in range(grid.width) if _is_over_blank(grid, row - 1, column, understand)]
        texts += [Heading(column, grid.text(row - 1, column)) for column in alone]
    return tuple(sorted(texts, key=lambda heading: heading.column))


def _grouped(above: str, text: str, understand: Understand) -> str:
    """With the heading above it, where that one spans several columns and says more."""
    if not above or above == text:
        return text
    if _NUMBER.fullmatch(text):
        over = understand(above)
        return f"{text} {over.unit or '?'} ({above})" if over is not None and over.field == "concentration" else text
    alone = understand(text)
    both = (
        combined for combined in (f"{above} {text}", f"{text} {above}") if understand(combined) not in (None, alone)
    )
    return next(both, text)


def groups(grid: Grid, row: int, understand: Understand) -> Callable[[int], str]:
    """The heading that the row above has for several columns: a merged cell, or in a CSV the last one to the left.

    What holds for the whole row is looked up once: every row of a book is asked whether it is one of headings.
    """
    if row == 0 or not grid.filled(row - 1) or any(row_facts(grid, row - 1, understand, True)):
        return lambda _: ""
    if grid.spans and any((row - 1, c) in grid.spans for c in range(grid.width)):
        return partial(_in_two_rows, grid, row, understand)
    is_full = all(grid.text(row - 1, c) for c in grid.filled(row))
    return partial(_to_the_left, grid, row, understand, is_full)


def _in_two_rows(grid: Grid, row: int, understand: Understand, column: int) -> str:
    is_over = (row - 1, column) in grid.spans or _is_over_its_own(grid, row - 1, column, understand)
    return grid.text(row - 1, column) if is_over else ""


def _is_heading(grid: Grid, row: int, column: int, understand: Understand) -> bool:
    if _is_over_blank(grid, row, column, understand):
        return _is_grouping(grid, row)
    return _is_over_its_own(grid, row, column, understand)


def _is_over_its_own(grid: Grid, row: int, column: int, understand: Understand) -> bool:
    """`Probe` over `#`, `Who` over `operator`: a heading in two rows, and no label of the cell beside it."""
    upper, lower = grid.text(row, column), grid.text(row + 1, column)
    found, below = understand(upper), understand(lower)
    if lower and (below is None or below.field == "derived"):  # "#" alone is a mere number of the row
        below = understand(f"{upper} {lower}")
    return found is not None and below is not None and below.field == found.field


def _is_grouping(grid: Grid, row: int) -> bool:
    """A merged cell stands over two headings or more."""
    over = (c for c in range(grid.width) if _is_spanning(grid, row, c) or grid.spans.get((row, c), (row, c))[1] < c)
    return sum(bool(grid.text(row + 1, column)) for column in over) > 1


def _is_over_blank(grid: Grid, row: int, column: int, understand: Understand) -> bool:
    is_alone = (row, column) not in grid.spans and not grid.text(row + 1, column)
    return is_alone and understand(grid.text(row, column)) is not None


def _to_the_left(grid: Grid, row: int, understand: Understand, is_full: bool, column: int) -> str:
    if _is_over_its_own(grid, row - 1, column, understand):
        return grid.text(row - 1, column)
    is_number = _NUMBER.fullmatch(grid.text(row, column)) is not None
    if is_number and is_full:
        return ""
    left = next((grid.text(row - 1, c) for c in range(column, -1, -1) if grid.text(row - 1, c)), "")
    return left if is_number or _STAGE.search(left) else ""


def _is_spanning(grid: Grid, row: int, column: int) -> bool:
    """A cell merged over several columns heads them, and is no label of the cell beside it."""
    return (row, column + 1) in grid.spans and grid.spans[row, column + 1] == (row, column)


def row_facts(grid: Grid, row: int, understand: Understand, is_above_headings: bool = False) -> Iterator[Fact]:
    """`Probe: K-07` in one cell, or `Probe` with its value to the right."""
    filled = grid.filled(row)
    for place, column in enumerate(filled):
        cell = grid.at(row, column)
        if not isinstance(cell, str) or BARE_STAGE.fullmatch(cell) or _is_spanning(grid, row, column):
            continue
        both = _KEY_VALUE.fullmatch(cell) or re.fullmatch(r"((?i:probe|electrode|animal))\s+(\S+)", cell)
        if both and understand(both[1]):
            yield Fact(both[1], both[2], (row, column))
        elif understand(cell) and place + 1 < len(filled) and filled[place + 1] <= column + 3:
            value = grid.at(row, filled[place + 1])
            if is_above_headings and not _DIGIT.search(str(value)) and _is_heading(grid, row, column, understand):
                continue
            if not (isinstance(value, str) and understand(value)) or BARE_STAGE.fullmatch(str(value)):
                yield Fact(cell, value, (row, filled[place + 1]))
