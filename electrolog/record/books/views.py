"""One entry of a book as its table shows it: the cells of its row, or of its rows of points, and what holds for all."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

from electrolog.record.books.drafts import Extract
from electrolog.record.books.grid import Content, Marks, Spot, cell_name, shown
from electrolog.record.books.headings import Meaning
from electrolog.record.books.layout import TOTALS, Table
from electrolog.record.books.mapping import BookMapping

TELLS_APART = ("electrode", "day", "time", "stage", "analyte")


@dataclass(frozen=True)
class Found:
    """A cell with what its heading means; `meaning` None: a heading that says nothing known."""

    meaning: Meaning | None
    heading: str
    value: Content
    spot: Spot

    @property
    def field(self) -> str:
        return self.meaning.field if self.meaning else "other"


@dataclass(frozen=True)
class View:
    table: Table
    rows: tuple[tuple[Found, ...], ...]  # one, or one for each concentration
    numbers: tuple[int, ...]  # of the rows in the sheet
    facts: tuple[Found, ...]

    def cells(self, field: str, stage: str | None = None) -> list[Found]:
        """The filled cells of a field in the first row, the table's labelled cells after them."""
        return [
            one
            for one in (*self.rows[0], *self.facts)
            if one.field == field
            and one.value is not None
            and (stage is None or (one.meaning and one.meaning.stage == stage))
        ]

    def first(self, field: str, stage: str = "") -> Found | None:
        """Of the stage, or of none in particular."""
        exact = self.cells(field, stage) if stage else []
        return next(iter(exact or self.cells(field, "")), None)

    def place(self, found: Found) -> str:
        return self.table.grid.place(*found.spot)

    @property
    def range(self) -> str:
        """`Sheet1!A4:H4`, the facts' own cells left aside."""
        first, last = self.numbers[0], self.numbers[-1]
        columns = sorted(one.spot[1] for row in self.rows for one in row) or [0]
        columns = columns[-1:] if self.table.matrix else columns  # the cells between belong to other probes
        ends = [(first, columns[0]), (last, columns[-1])]
        turned = self.table.grid.turned
        names = [cell_name(*(reversed(spot) if turned else spot)) for spot in ends]
        return f"{self.table.grid.name}!{':'.join(dict.fromkeys(names))}"

    def marks(self) -> Iterator[tuple[str, Marks]]:
        for row in self.rows:
            for one in row:
                marks = self.table.grid.marks.get(one.spot)
                if marks:
                    yield self.place(one), marks


def views(table: Table, mapping: BookMapping, extract: Extract) -> Iterator[View]:
    facts = tuple(Found(mapping.understand(fact.heading), fact.heading, fact.value, fact.spot) for fact in table.facts)
    rows = [(number, row) for number in table.rows if (row := _row(table, number, mapping))]
    rows = [(number, row) for number, row in rows if not _left_out(table, number, row, extract)]
    if _has_points_down(table, mapping):
        for group in _grouped(rows):
            yield View(table, tuple(row for _, row in group), tuple(number for number, _ in group), facts)
    else:
        for number, row in rows:
            yield View(table, (row,), (number,), facts)


def _row(table: Table, number: int, mapping: BookMapping) -> tuple[Found, ...]:
    cells = [
        Found(
            mapping.understand(heading.text),
            heading.text,
            table.grid.at(number, heading.column),
            (number, heading.column),
        )
        for heading in table.headings
    ]
    loose = [
        Found(None, "", table.grid.at(number, column), (number, column))
        for column in table.grid.filled(number)
        if column > table.last_column
        and column <= table.last_column + 2
        and table.grid.filled(table.header)[-1] < column
    ]
    found = [*cells, *loose]
    return tuple(found) if any(one.value is not None for one in found) else ()


def _left_out(table: Table, number: int, row: tuple[Found, ...], extract: Extract) -> bool:
    filled = [one for one in row if one.value is not None]
    first = shown(filled[0].value)
    if all(shown(one.value) in one.heading for one in filled if one.heading) and all(one.heading for one in filled):
        return True  # the headings again
    if isinstance(filled[0].value, str) and TOTALS.fullmatch(first) and filled[0].field != "note":
        extract.say("left out", table.grid.place(*filled[0].spot), f"'{first}' begins a row of totals")
        return True
    return False


def _has_points_down(table: Table, mapping: BookMapping) -> bool:
    found = [mapping.understand(heading.text) for heading in table.headings]
    return any(one and one.field == "concentration" for one in found) and any(
        one and one.field == "current" for one in found
    )


def _grouped(rows: list[tuple[int, tuple[Found, ...]]]) -> Iterator[list[tuple[int, tuple[Found, ...]]]]:
    """Consecutive rows of one calibration: until a cell that tells entries apart says something else."""
    group: list[tuple[int, tuple[Found, ...]]] = []
    held: dict[str, Content] = {}
    for number, row in rows:
        said = {one.heading: one.value for one in row if one.field in TELLS_APART and one.value is not None}
        if group and any(held.get(heading) != value for heading, value in said.items()):
            yield group
            # A new entry repeats only what differs: the rest stands above it, as in a merged cell.
            new_probe = any(one.field == "electrode" and held.get(one.heading) != one.value for one in row if one.value)
            group, held = [], {} if new_probe else held
        group.append((number, row if group else _carried(row, held)))
        held = {**held, **said}
    if group:
        yield group


def _carried(row: tuple[Found, ...], held: dict[str, Content]) -> tuple[Found, ...]:
    return tuple(
        Found(one.meaning, one.heading, held[one.heading], one.spot)
        if one.value is None and one.heading in held
        else one
        for one in row
    )
