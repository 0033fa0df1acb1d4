"""Where the tables of a sheet are: their heading rows, the rows below, the labelled cells above that hold for all."""

from __future__ import annotations

import re
from collections.abc import Callable, Iterator
from dataclasses import dataclass
from functools import partial
from itertools import pairwise

from electrolog.record.books.grid import Content, Grid, Spot
from electrolog.record.books.headings import Meaning
from electrolog.record.books.matrix import Matrix, matrix

MEASURED = ("sensitivity", "current", "concentration", "duration")
TOTALS = re.compile(
    r"(grand )?(total|mean|average|avg\.?|sum|sd|st\.? ?dev\.?|sem|std\.?|median|min|max|n)\b.{0,12}", re.IGNORECASE
)
_KEY_VALUE = re.compile(r"([^:]{1,40}):\s*(\S.*)")
_STAGE = re.compile(r"\b(pre|post|before|after)\b", re.IGNORECASE)
_NUMBER = re.compile(r"\d+([.,]\d+)?")
_BARE_STAGE = re.compile(r"pre|post|before|after", re.IGNORECASE)
_ONLY_UNIT = re.compile(
    r"[\[(]?\s*[unmpµμ]?([amhsv]|min)\s*(/\s*[unmpµμ]?[am])?\s*[\])]?|\W?°?c\W?|units?", re.IGNORECASE
)
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
    above = [fact for row in range(start, header.row) for fact in row_facts(grid, row, understand)]
    kept = [h for h in header.headings if h.column in found.beside]
    key = Heading(found.key, grid.text(header.row, found.key) if found.holds == "concentration" else "Date")
    usual = "Current" if found.holds == "concentration" else "Sensitivity"
    measured = _caption(grid, header.row, understand) or usual
    rows = tuple(row for row in range(header.below, last) if grid.filled(row))
    for column, label in found.probes:
        probe = Fact("Probe", label, (header.row, column))
        yield Table(grid, header.row, (key, *kept, Heading(column, measured)), rows, (*above, probe), found)


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
    facts = tuple(
        fact
        for row in range(start, header.row)
        for fact in row_facts(grid, row, understand)
        if low <= fact.spot[1] < high
    )
    rows = tuple(row for row in range(header.below, last) if any(low <= column < high for column in grid.filled(row)))
    return Table(grid, header.row, part, rows, facts)


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
        headings = _headings(grid, row, understand)
        across = None
        if not _is_header(grid, row, headings, understand):
            texts = {heading.column: grid.text(row, heading.column) for heading in headings}
            across = matrix(grid, row, texts, _groups(grid, row, understand), understand)
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
    if any(map(_BARE_STAGE.fullmatch, texts)) and any((m := understand(text)) and m.field == "stage" for text in texts):
        return False  # "Stage | pre | post" is a row of values
    known = [found for found in (understand(heading.text) for heading in headings) if found is not None]
    if sum(isinstance(grid.at(row, heading.column), str) for heading in headings) * 3 < len(headings):
        numeric = [found for found in known if found.concentration_um is not None]
        if len(numeric) < 2:
            return False
    return len(known) >= 2 and len(known) * 5 >= len(headings) * 2 and any(found.field in MEASURED for found in known)


def _headings(grid: Grid, row: int, understand: Understand) -> tuple[Heading, ...]:
    texts, over = [], _groups(grid, row, understand)
    for column in grid.filled(row) + [c for c in range(grid.width) if grid.spans.get((row, c), (row, c))[0] < row]:
        text = grid.text(row, column)
        if text and len(text) <= 80:
            texts.append(Heading(column, _grouped(over(column), text, understand)))
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


def _groups(grid: Grid, row: int, understand: Understand) -> Callable[[int], str]:
    """The heading that the row above has for several columns: a merged cell, or in a CSV the last one to the left.

    What holds for the whole row is looked up once: every row of a book is asked whether it is one of headings.
    """
    if row == 0 or not grid.filled(row - 1) or any(row_facts(grid, row - 1, understand)):
        return lambda _: ""
    if grid.spans and any((row - 1, c) in grid.spans for c in range(grid.width)):
        return lambda column: grid.text(row - 1, column) if (row - 1, column) in grid.spans else ""
    is_full = all(grid.text(row - 1, c) for c in grid.filled(row))
    return partial(_to_the_left, grid, row, is_full)


def _to_the_left(grid: Grid, row: int, is_full: bool, column: int) -> str:
    is_number = _NUMBER.fullmatch(grid.text(row, column)) is not None
    if is_number and is_full:
        return ""
    left = next((grid.text(row - 1, c) for c in range(column, -1, -1) if grid.text(row - 1, c)), "")
    return left if is_number or _STAGE.search(left) else ""


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


def _is_spanning(grid: Grid, row: int, column: int) -> bool:
    """A cell merged over several columns heads them, and is no label of the cell beside it."""
    return (row, column + 1) in grid.spans and grid.spans[row, column + 1] == (row, column)


def row_facts(grid: Grid, row: int, understand: Understand) -> Iterator[Fact]:
    """`Probe: K-07` in one cell, or `Probe` with its value to the right."""
    filled = grid.filled(row)
    for place, column in enumerate(filled):
        cell = grid.at(row, column)
        if not isinstance(cell, str) or _BARE_STAGE.fullmatch(cell) or _is_spanning(grid, row, column):
            continue
        both = _KEY_VALUE.fullmatch(cell) or re.fullmatch(r"((?i:probe|electrode|animal))\s+(\S+)", cell)
        if both and understand(both[1]):
            yield Fact(both[1], both[2], (row, column))
        elif understand(cell) and place + 1 < len(filled) and filled[place + 1] <= column + 3:
            value = grid.at(row, filled[place + 1])
            if not (isinstance(value, str) and understand(value)) or _BARE_STAGE.fullmatch(str(value)):
                yield Fact(cell, value, (row, filled[place + 1]))
