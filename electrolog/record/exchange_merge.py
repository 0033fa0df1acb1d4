"""What becomes of each row of a file: added, there already, filled in, left struck, or a fault."""

from __future__ import annotations

from collections import defaultdict
from dataclasses import dataclass, field
from typing import Any

from electrolog.errors import InputError, shortened
from electrolog.record import columns as kinds
from electrolog.record import entry, schema, sheets
from electrolog.record.builtin import WORDS
from electrolog.record.columns import Column
from electrolog.record.exchange_amend import Changes, write_amendment
from electrolog.record.exchange_faults import Faults
from electrolog.record.exchange_files import CHUNK, Rows
from electrolog.record.exchange_known import (
    Known,
    StoredPoints,
    Values,
    is_labelled,
    key_of,
    known_rows,
    stored_points,
)
from electrolog.record.exchange_links import resolve
from electrolog.record.exchange_new import SHARED, take_new
from electrolog.record.exchange_points import FilePoints
from electrolog.record.journal import Writer


@dataclass
class Counts:
    added: int = 0
    there: int = 0
    filled: int = 0


@dataclass
class Import:
    """An import under way, across its files."""

    writer: Writer
    faults: Faults
    points: FilePoints
    counts: dict[str, Counts] = field(default_factory=lambda: defaultdict(Counts))
    notes: list[str] = field(default_factory=list)
    unsure: set[str] = field(default_factory=set)  # sheets whose files couldn't be read whole
    kept_out: int = 0  # the number of the last row that a fault kept out, below zero
    left_struck: dict[str, set[int]] = field(default_factory=lambda: defaultdict(set))


class SheetMerge:
    """One file against the record."""

    at_once = True  # whether plain new rows may be taken in together

    def __init__(self, under_way: Import, rows: Rows) -> None:
        self.all = under_way
        self.rows = rows
        self.sheet = rows.sheet
        self.counts = under_way.counts[rows.sheet.name]
        self.known: Known = known_rows(under_way.writer.connection, rows.sheet)
        self.names = [schema.column_name(column) for column in rows.sheet.columns]
        self.key = key_of(rows.sheet)
        self.seen: dict[Any, int] = {}
        self.stored = StoredPoints()
        self.left: list[str] = []
        self.kept_out: set[str] = set()  # folded labels of rows with faults

    def take(self) -> None:
        """Every row of the file; nothing is written once there is a fault, but all the rows are looked at."""
        writer = self.all.writer
        if is_labelled(self.sheet):
            writer.names.everything(self.sheet.name)
        resolve(self.rows, writer.names, self.all.unsure, self.all.faults)
        if self.sheet is sheets.CALIBRATIONS and (self.known.live or self.known.struck):
            self.stored = stored_points(writer.connection)
        for start in range(0, len(self.rows.lines), CHUNK):
            columns = [column[start : start + CHUNK] for column in self.rows.cells]
            if not (self.at_once and take_new(self, start, columns)):
                self._take_one_by_one(start, columns)
                writer.flush()
        self._note_left()

    def take_strays(self) -> None:
        """Points of calibrations that have no row in the folder: the record has them already, or they are a fault."""
        if "calibrations" not in self.all.unsure:
            taken = set(self.seen) | self.kept_out
            self.all.counts["calibration_points"].there += self.all.points.refuse_strays(
                taken, self.known, self.stored, self.all.writer.names, self.all.faults
            )

    def _take_one_by_one(self, start: int, columns: list[list[Any]]) -> None:
        for index, values in enumerate(zip(*columns, strict=True), start):
            if index in self.rows.faulty:
                self._keep_out(values)
            else:
                self._take_row(index, values)

    def _take_row(self, index: int, values: Values) -> None:
        key = self.key(values)
        if self._is_double(index, key, values) or self._repeats_built_in(values):
            return
        live = self.known.live.get(key)
        if live is not None and self._is_lookalike(index, values, live[1]):
            return
        if live is not None and self._says_nothing_new(key, values, *live):
            self._count_there(key)
        elif (struck := self._struck_equal(key, values)) is not None:
            self._leave_struck(values, struck)
        elif self.all.left_struck and self._rests_on_struck(index, values):
            pass
        elif live is not None:
            self._amend(index, key, values, *live)
        else:
            self._add(index, key, values)

    def _fault(self, index: int, said: str) -> None:
        self.all.faults.add(self.rows.file, self.rows.lines[index], said)

    def _is_double(self, index: int, key: Any, values: Values) -> bool:
        first = self.seen.setdefault(key, index)
        if first == index:
            return False
        there, line = self._shown(values, self.sheet.key), self.rows.lines[first]
        before = self.rows.cells[0][first]
        if is_labelled(self.sheet) and before != values[0]:
            said = f"{there} differs from '{shortened(before)}' on line {line} by case alone; accepted: one of them"
        else:
            said = f"{there} stands on line {line} already; accepted: one row for each"
        self._fault(index, f"{', '.join(self.sheet.key)}: {said}")
        return True

    def _repeats_built_in(self, values: Values) -> bool:
        if self.sheet is not sheets.TERMS or values[1].casefold() not in map(str.casefold, WORDS[values[0]]):
            return False
        self.counts.there += 1
        return True

    def _is_lookalike(self, index: int, values: Values, held: Values) -> bool:
        """Two labels that differ by case alone would be one probe to a tired eye."""
        if not is_labelled(self.sheet) or self.sheet in SHARED or values[0] == held[0]:
            return False
        self._fault(
            index,
            f"{self.sheet.key[0]}: '{shortened(values[0])}' differs from '{shortened(held[0])}' in the record by case"
            " alone; accepted: the same spelling, or a label that can't be mistaken for another",
        )
        return True

    def _says_nothing_new(self, key: Any, values: Values, row_id: int, held: Values) -> bool:
        if not self._points_agree(key, row_id):
            return False
        return values == held or not self._changes(values, row_id, held)

    def _points_agree(self, key: Any, row_id: int) -> bool:
        if self.sheet is not sheets.CALIBRATIONS:
            return True
        return self.all.points.agree(key, (self.stored.live[row_id], self.stored.every[row_id]))

    def _changes(self, values: Values, row_id: int, held: Values) -> Changes:
        """Columns in which the file says something else than the record: column -> (before, after).

        An empty cell says nothing, except of a built-in row that nobody has touched: there the lab's file is the
        only one who ever spoke, and without its silence an export could not be read back as it was.
        """
        takes_all = row_id in self.known.untouched
        return {
            column.name: (before, after)
            for column, before, after in zip(self.sheet.columns, held, values, strict=True)
            if before != after
            and column.name not in self.sheet.key
            and (after is not None or (takes_all and column.name in self.rows.present))
        }

    def _count_there(self, key: Any) -> None:
        self.counts.there += 1
        if self.sheet is sheets.CALIBRATIONS:
            self.all.counts["calibration_points"].there += len(self.all.points.of(key))

    def _struck_equal(self, key: Any, values: Values) -> int | None:
        for row_id, held in self.known.struck.get(key, ()):
            if self._points_agree(key, row_id) and not self._changes(values, row_id, held):
                return row_id
        return None

    def _leave_struck(self, values: Values, row_id: int) -> None:
        self.left.append(self._shown(values, self.sheet.key))
        self.all.left_struck[self.sheet.name].add(row_id)
        self._remember(values, row_id)

    def _rests_on_struck(self, index: int, values: Values) -> bool:
        for column, value in zip(self.sheet.columns, values, strict=True):
            if isinstance(column, kinds.Link) and value in self.all.left_struck.get(column.to, ()):
                shown = self._shown(values, (column.name,))
                self._fault(index, f"{column.name}: {shown} was struck; accepted: a live {column.to} row")
                return True
        return False

    def _amend(self, index: int, key: Any, values: Values, row_id: int, held: Values) -> None:
        """Fills in what the record didn't know; what it knows otherwise is a fault."""
        changes = self._changes(values, row_id, held)
        refused = self.sheet is sheets.CALIBRATIONS and self.all.points.refuse_other(
            key, row_id, self.stored, self.all.faults
        )
        for name, (before, after) in changes.items():
            if before is not None and row_id not in self.known.untouched:
                self._refuse_other_value(index, self.sheet.by_name[name], before, after)
                refused = True
        if refused or not self._passes(index, tuple(values), held, bool(self.stored.live.get(row_id))):
            return
        self.counts.filled += 1
        if not self.all.faults:
            write_amendment(self.all.writer, self.sheet, row_id, changes)

    def _refuse_other_value(self, index: int, column: Column, before: Any, after: Any) -> None:
        self._fault(
            index,
            f"{column.name}: found {self._written(column, after)}, the record has {self._written(column, before)};"
            " accepted: the same, or an empty cell; correct the record with `electrolog amend`",
        )

    def _add(self, index: int, key: Any, values: Values) -> None:
        points = self.all.points.of(key) if self.sheet is sheets.CALIBRATIONS else []
        row = dict(zip(self.names, values, strict=True))
        if not self._passes(index, values, (), bool(points)):
            self._remember(values)
            return
        self.counts.added += 1
        if points:
            self.all.counts["calibration_points"].added += len(points)
        if self.all.faults:
            self._remember(values)
        else:
            entry.insert(self.all.writer, self.sheet, row, points)

    def _passes(self, index: int, values: Values, held: Values, has_points: bool) -> bool:
        """Rules between the columns of one row, with what the record knows where the file is silent."""
        row = dict(zip(self.names, held or values, strict=True))
        if held:
            row.update({name: value for name, value in zip(self.names, values, strict=True) if value is not None})
        try:
            entry.check_row(self.sheet, row, has_points)
        except InputError as why:
            self._fault(index, why.message)
            return False
        return True

    def _keep_out(self, values: Values) -> None:
        self._remember(values)
        if is_labelled(self.sheet) and values[0]:
            self.kept_out.add(values[0].casefold())

    def _remember(self, values: Values, row_id: int | None = None) -> None:
        """A name that the folder has, whatever became of its row: links to it are no fault of their own.

        A row that isn't written has a number that no other has, or two such rows would pass for one.
        """
        names = self.all.writer.names
        if row_id is None:
            self.all.kept_out -= 1
            row_id = self.all.kept_out
        if self.sheet is sheets.TERMS:
            if values[0] and values[1]:
                names.add_word(values[0], values[1])
        elif is_labelled(self.sheet) and values[0] and names.spelled(self.sheet.name, values[0]) is None:
            names.add(self.sheet.name, values[0], row_id)

    def _shown(self, values: Values, columns: tuple[str, ...]) -> str:
        places = [list(self.sheet.by_name).index(name) for name in columns]
        return ", ".join(self._written(self.sheet.columns[place], values[place]) for place in places)

    def _written(self, column: Column, value: Any) -> str:
        if isinstance(column, kinds.Link):
            named = self.all.writer.names.everything(column.to).values()
            value = next((name for name, row_id in named if row_id == value), value)
        return f"'{shortened(column.write(value))}'"

    def _note_left(self) -> None:
        if self.left:
            shown = "; ".join(self.left[:5]) + ("; …" if len(self.left) > 5 else "")
            self.all.notes.append(
                f"{self.sheet.name}: {len(self.left)} equal a struck row and were left struck: {shown}"
            )
