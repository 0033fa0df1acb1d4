"""Where the tables of a sheet are: their heading rows, the rows below, the labelled cells above that hold for all."""

from __future__ import annotations

import re
from collections.abc import Iterator
from dataclasses import dataclass
from itertools import pairwise

from electrolog.record.books.grid import Grid
from electrolog.record.books.heading_rows import (
    BARE_STAGE,
    Fact,
    Heading,
    Understand,
    groups,
    headings_of,
    row_facts,
)
from electrolog.record.books.headings import Meaning
from electrolog.record.books.matrix import BESIDE, Matrix, matrix

MEASURED = ("sensitivity", "current", "concentration", "duration")
TOTALS = re.compile(
    r"(grand )?(total|mean|average|avg\.?|sum|st\.? ?dev\.?|(sd|sem|std\.?|median|min|max|n)(?![-_. ]?\d))\b.{0,12}",
    re.IGNORECASE,  # but `N-1` and `SD 12` are probes
)
_ONLY_UNIT = re.compile(
    r"[\[(]?\s*[unmpµμ]?([amhsv]|min)\s*(/\s*[unmpµμ]?[am])?\s*[\])]?|\W?°?c\W?|units?", re.IGNORECASE
)


@dataclass(frozen=True)
class Table:
    grid: Grid
    header: int
    headings: tuple[Heading, ...]
    rows: tuple[int, ...]
    facts: tuple[Fact, ...]
    matrix: Matrix | None = None  # of which this table is one probe's column

    @property
    def last_column(self) -> int:
        return max(heading.column for heading in self.headings)


@dataclass(frozen=True)
class _Header:
    row: int
    below: int  # the first row that may hold data
    headings: tuple[Heading, ...]
    matrix: Matrix | None = None


def tables(grid: Grid, understand: Understand) -> list[Table]:
    """The tables of a sheet; where headings stand down the first column instead, those of the sheet turned."""
    found = _tables(grid, understand)
    return found or _tables(grid.turn(), understand)


def _tables(grid: Grid, understand: Understand) -> list[Table]:
    headers = _headers(grid, understand)
    if not headers:
        return []
    ends = [header.row for header in headers[1:]] + [len(grid.rows)]
    found: list[Table] = []
    start = 0
    for header, end in zip(headers, ends, strict=True):
        last = _data_end(grid, header, end, understand)
        if header.matrix is not None:
            found += _by_probe(grid, header, header.matrix, start, last, understand)
            start = last
            continue
        made = [_segment(grid, header, part, start, last, understand) for part in _segments(header, understand)]
        if found and len(made) == 1 and not made[0].facts and made[0].headings == found[-1].headings:
            made = [_joined(found.pop(), made[0])]  # only the headings again
        found += made
        start = last
    return found


def _by_probe(
    grid: Grid, header: _Header, found: Matrix, start: int, last: int, understand: Understand
) -> Iterator[Table]:
    """A table for each probe: the rows' keys, what is said beside them, and its own column."""
    above = list(_facts_above(grid, header, start, understand))
    kept = [h for h in header.headings if h.column in found.beside]
    key = Heading(found.key, grid.text(header.row, found.key) if found.holds == "concentration" else "Date")
    usual = "Current" if found.holds == "concentration" else "Sensitivity"
    measured = _caption(grid, header.row, understand) or usual
    filled = [row for row in range(header.below, last) if grid.filled(row)]
    labelled = [row for row in filled if (m := understand(grid.text(row, found.key))) and m.field in BESIDE[:-1]]
    rows = tuple(row for row in filled if row not in labelled)
    for column, label in found.probes:
        probe = Fact("Probe", label, (header.row, column))
        own = [
            Fact(grid.text(row, found.key), value, (row, column))
            for row in labelled
            if (value := grid.at(row, column)) is not None
        ]
        yield Table(grid, header.row, (key, *kept, Heading(column, measured)), rows, (*own, *above, probe), found)


def _caption(grid: Grid, end: int, understand: Understand) -> str:
    """What the nearest cell above says that such tables hold."""
    texts = (grid.own_text(row, column) for row in reversed(range(end)) for column in grid.filled(row))
    return next((text for text in texts if (m := understand(text)) and m.field in MEASURED[:2] and m.unit), "")


def _joined(first: Table, second: Table) -> Table:
    return Table(first.grid, first.header, first.headings, first.rows + second.rows, first.facts)


def _segment(
    grid: Grid, header: _Header, part: tuple[Heading, ...], start: int, last: int, understand: Understand
) -> Table:
    whole = len(part) == len(header.headings)
    low = 0 if whole else part[0].column
    high = grid.width if whole else _next_start(header, part)
    facts = tuple(fact for fact in _facts_above(grid, header, start, understand) if low <= fact.spot[1] < high)
    rows = tuple(row for row in range(header.below, last) if any(low <= column < high for column in grid.filled(row)))
    return Table(grid, header.row, part, rows, facts)


def _facts_above(grid: Grid, header: _Header, start: int, understand: Understand) -> Iterator[Fact]:
    for row in range(start, header.row):
        yield from row_facts(grid, row, understand, is_above_headings=row == header.row - 1)


def _next_start(header: _Header, part: tuple[Heading, ...]) -> int:
    later = [heading.column for heading in header.headings if heading.column > part[-1].column]
    return min(later, default=10**6)


def _segments(header: _Header, understand: Understand) -> list[tuple[Heading, ...]]:
    """Blocks side by side: each begins where a column of concentrations does."""
    starts = [i for i, heading in enumerate(header.headings) if _is_plain_concentration(understand(heading.text))]
    if len(starts) < 2:
        return [header.headings]
    return [header.headings[a:b] for a, b in pairwise([*starts, len(header.headings)])]


def _is_plain_concentration(found: Meaning | None) -> bool:
    return found is not None and found.field == "concentration"


def _headers(grid: Grid, understand: Understand) -> list[_Header]:
    found: list[_Header] = []
    for row in range(len(grid.rows)):
        if found and found[-1].below > row:
            continue  # the units of the row above
        headings = headings_of(grid, row, understand)
        across = None
        if not _is_header(grid, row, headings, understand):
            texts = {heading.column: grid.text(row, heading.column) for heading in headings}
            across = matrix(grid, row, texts, groups(grid, row, understand), understand)
            if across is None:
                continue
        if found and found[-1].row == row - 1:  # the row above only grouped these
            found.pop()
        below = row + 1
        if _is_units_row(grid, below):
            headings = tuple(_with_unit_below(grid, below, heading) for heading in headings)
            below += 1
        found.append(_Header(row, below, headings, across))
    return found


def _is_header(grid: Grid, row: int, headings: tuple[Heading, ...], understand: Understand) -> bool:
    if len(headings) < 2 or any(
        fact.spot[0] == row and ":" in fact.heading for fact in row_facts(grid, row, understand)
    ):
        return False
    texts = [heading.text for heading in headings]
    if any(map(BARE_STAGE.fullmatch, texts)) and any((m := understand(text)) and m.field == "stage" for text in texts):
        return False  # "Stage | pre | post" is a row of values
    known = [found for found in (understand(heading.text) for heading in headings) if found is not None]
    if sum(isinstance(grid.at(row, heading.column), str) for heading in headings) * 3 < len(headings):
        numeric = [found for found in known if found.concentration_um is not None]
        if len(numeric) < 2:
            return False
    return len(known) >= 2 and len(known) * 5 >= len(headings) * 2 and any(found.field in MEASURED for found in known)


def _is_units_row(grid: Grid, row: int) -> bool:
    if row >= len(grid.rows) or not grid.filled(row):
        return False
    return all(_ONLY_UNIT.fullmatch(grid.text(row, column)) for column in grid.filled(row))


def _with_unit_below(grid: Grid, row: int, heading: Heading) -> Heading:
    unit = grid.text(row, heading.column).strip("[]() ")
    return Heading(heading.column, f"{heading.text} ({unit})") if unit else heading


def _data_end(grid: Grid, header: _Header, end: int, understand: Understand) -> int:
    """Where the rows of this table end and the labelled cells of the next one begin."""
    measured = {h.column for h in header.headings if (m := understand(h.text)) and m.field in MEASURED}
    measured |= {column for column, _ in header.matrix.probes} if header.matrix else set()
    for row in range(header.below, end):
        numeric = any(isinstance(grid.at(row, column), float) for column in measured)
        if not numeric and any(row_facts(grid, row, understand)) and end < len(grid.rows):
            return row
    return end
