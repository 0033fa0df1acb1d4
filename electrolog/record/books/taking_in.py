"""Drafts against the record: each added, there already, or refused by a rule; tried first, then written as a whole."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field
from typing import Any, Protocol

from electrolog.errors import InputError, shortened
from electrolog.record import columns as kinds
from electrolog.record import sheets
from electrolog.record.books.drafts import Draft, Extract
from electrolog.record.exchange_faults import Faults
from electrolog.record.exchange_files import Rows
from electrolog.record.exchange_known import Values, key_of
from electrolog.record.exchange_merge import Import, SheetMerge
from electrolog.record.exchange_points import FilePoints
from electrolog.record.journal import Writer
from electrolog.record.sheets import Sheet
from electrolog.record.store import Record

TAKEN = (sheets.BATCHES, sheets.ELECTRODES, sheets.COATINGS, sheets.CALIBRATIONS, sheets.EXPOSURES)
STATES = {"added": "new", "there": "there already", "filled": "filled in"}


@dataclass(frozen=True)
class Origin:
    """Where a row comes from, kept as the reason of its journal entry."""

    book: str
    fingerprint: str

    def of(self, draft: Draft) -> str:
        return f"adopted from {self.book} {draft.place}, SHA-256 {self.fingerprint}"


class SaysOrigin(Protocol):
    def of(self, draft: Draft) -> str: ...


class _TriedOnly(Exception):
    """Rolls a dry run back."""


@dataclass
class BookFaults(Faults):
    told: list[tuple[str, int, str]] = field(default_factory=list)

    def add(self, file: str, line: int, said: str) -> None:
        super().add(file, line, said)
        self.told.append((file, line, said))


class BookMerge(SheetMerge):
    """A sheet's drafts. The note is no part of what a row says: a book that has grown has another fingerprint."""

    at_once = False  # each row has an origin of its own, which stands in its journal entry

    def __init__(self, under_way: Import, rows: Rows, drafts: Sequence[Draft], origin: SaysOrigin) -> None:
        super().__init__(under_way, rows)
        self.drafts, self.origin = drafts, origin
        self.states: dict[int, str] = {}

    def _take_row(self, index: int, values: Values) -> None:
        self.all.writer.reason = self.origin.of(self.drafts[index])
        before = vars(self.counts).copy()
        super()._take_row(index, values)
        grown = [name for name, count in vars(self.counts).items() if count != before[name]]
        self.states[id(self.drafts[index])] = STATES[grown[0]] if grown else "left struck"

    def _changes(self, values: Values, row_id: int, held: Values) -> Any:
        return {name: change for name, change in super()._changes(values, row_id, held).items() if name != "note"}


def unique(out: Extract) -> list[Draft]:
    """One draft for each row of the record; two entries that say different things of one are both refused."""
    kept: list[Draft] = []
    for sheet in TAKEN:
        by_key: dict[Any, Draft] = {}
        for draft in [one for one in out.of(sheet.name) if _is_readable(one, sheet, out)]:
            first = by_key.setdefault(_key(draft, sheet), draft)
            if first is not draft and sheet in (sheets.CALIBRATIONS, sheets.EXPOSURES):
                _report_double(out, sheet, first, draft)
        kept += [draft for draft in by_key.values() if not draft.doubtful]
    return kept


def _key(draft: Draft, sheet: Sheet) -> Any:
    return key_of(sheet)(tuple(draft.values.get(column.name) for column in sheet.columns))


def _report_double(out: Extract, sheet: Sheet, first: Draft, draft: Draft) -> None:
    if first.same_as(draft):
        out.say("left out", draft.place, f"repeats {first.place}: taken once")
        return
    first.doubtful = True
    for one, other in ((first, draft), (draft, first)):
        said = f"another {sheet.one} of this probe at this time stands at {other.place}, and says something else"
        out.say("refused", one.place, f"{said}; accepted: one of them, or a time of day for each")


def _is_readable(draft: Draft, sheet: Sheet, out: Extract) -> bool:
    """Every value within its column's bounds; the same rules as for what is typed."""
    try:
        draft.values.update({name: _read(sheet.by_name[name], value) for name, value in draft.values.items()})
        for concentration, current in draft.points:
            sheets.POINT_UM.checked(concentration, str(concentration))
            sheets.POINT_NA.checked(current, str(current))
    except InputError as why:
        out.say("refused", draft.place, why.message)
        return False
    return True


def _read(column: kinds.Column, value: kinds.Value) -> kinds.Value:
    if isinstance(value, str):
        return column.read(value) or None
    return column.checked(value, str(value)) if isinstance(column, kinds.Number) and isinstance(value, float) else value


def take_in(record: Record, drafts: list[Draft], out: Extract, origin: SaysOrigin, commit: bool) -> dict[int, str]:
    """What becomes of each draft (by its id); the record is changed only on `commit`, all at once.

    Rows that a rule of the record refuses are said in `out`.
    """
    states: dict[int, str] = {}
    while True:
        try:
            with record.writing() as writer:
                states, refused = _pass(writer, drafts, origin)
                if refused or not commit:
                    raise _TriedOnly
            return states
        except _TriedOnly:
            if not refused:
                return states
        for draft, said in refused:
            out.say("refused", draft.place, said)
        lost = {id(draft) for draft, _ in refused}
        drafts[:] = [draft for draft in drafts if id(draft) not in lost]


def _pass(writer: Writer, drafts: list[Draft], origin: SaysOrigin) -> tuple[dict[int, str], list[tuple[Draft, str]]]:
    faults = BookFaults()
    by_sheet = {sheet.name: [draft for draft in drafts if draft.sheet == sheet.name] for sheet in TAKEN}
    under_way = Import(writer, faults, FilePoints(_point_rows(by_sheet["calibrations"])))
    states: dict[int, str] = {}
    for sheet in TAKEN:
        rows = _rows(sheet, by_sheet[sheet.name])
        merge = BookMerge(under_way, rows, by_sheet[sheet.name], origin)
        merge.take()
        states |= merge.states
    refused = [
        (
            by_sheet[file.removesuffix(".csv").replace("calibration_points", "calibrations")][line - 1],
            shortened(said, 400),
        )
        for file, line, said in faults.told
    ]
    return states, refused


def _rows(sheet: Sheet, drafts: Sequence[Draft]) -> Rows:
    cells = [[draft.values.get(column.name) for draft in drafts] for column in sheet.columns]
    present = frozenset(name for draft in drafts for name in draft.values)
    return Rows(sheet, present, list(range(1, len(drafts) + 1)), cells)


def _point_rows(calibrations: Sequence[Draft]) -> Rows:
    rows = Rows(sheets.POINTS, frozenset(sheets.POINTS.by_name), cells=[[], [], []])
    for place, draft in enumerate(calibrations, start=1):
        for point in draft.points:
            rows.lines.append(place)
            for cells, value in zip(rows.cells, (draft.values["calibration"], *point), strict=True):
                cells.append(value)
    return rows
