"""Reading an exchange folder: which files it holds, their rows by column, and every fault a file has by itself."""

from __future__ import annotations

import csv
import sys
from collections.abc import Callable, Iterator, Sequence
from contextlib import contextmanager
from dataclasses import dataclass, field
from datetime import tzinfo
from itertools import islice
from pathlib import Path
from typing import Any, TextIO

from electrolog.errors import InputError, shortened, unknown, with_article
from electrolog.record.columns import Column
from electrolog.record.exchange_cells import CellReader, refusals
from electrolog.record.exchange_faults import FILES, Faults, printable
from electrolog.record.sheets import BY_NAME, Sheet

CHUNK = 1_000  # rows held as text at a time
MOST_BYTES = 2 * 10**9  # of one file, all of whose rows are held at once: some 5 × 10⁷ points
CELL_LIMIT = min(sys.maxsize, 2**31 - 1)
Progress = Callable[[str, int], None]  # what is under way, and rows done so far


@dataclass
class Rows:
    """The rows of one file by column: every column of the sheet in its order, None for what the file doesn't know."""

    sheet: Sheet
    present: frozenset[str] = frozenset()
    lines: list[int] = field(default_factory=list)
    cells: list[list[Any]] = field(default_factory=list)
    faulty: set[int] = field(default_factory=set)
    unsure: bool = False  # a row couldn't be told at all, so nobody can say which names the file has

    @property
    def file(self) -> str:
        return f"{self.sheet.name}.csv"

    def column(self, name: str) -> list[Any]:
        return self.cells[list(self.sheet.by_name).index(name)]


def read_folder(folder: Path, zone: tzinfo | None, faults: Faults, progress: Progress | None) -> dict[str, Rows]:
    """The files of the folder by sheet. Raises InputError when there is no such folder, or nothing to read in it."""
    found = _listed(folder, faults)
    rows = {}
    with _any_length_of_cell():
        for file in (file for file in FILES if file in found):
            sheet = BY_NAME[file.removesuffix(".csv")]
            rows[sheet.name] = _read_file(folder / file, sheet, zone, faults)
            if progress:
                progress(f"read {file}", len(rows[sheet.name].lines))
    return rows


def _listed(folder: Path, faults: Faults) -> set[str]:
    try:
        names = {path.name for path in folder.iterdir() if not path.is_dir()}
    except NotADirectoryError:
        raise InputError(f"{folder} is a file; accepted: a folder with files such as calibrations.csv") from None
    except FileNotFoundError:
        raise InputError(f"there is no folder {folder}; accepted: an exchange folder") from None
    except OSError as why:
        raise InputError(f"the folder {folder} can't be read: {why.strerror}") from None
    tables = {name for name in names if name.lower().endswith(".csv") and not name.startswith((".", "~"))}
    for name in sorted(tables.difference(FILES)):
        faults.add(printable(name), 0, unknown("exchange file", name, FILES).message)
    if not tables:
        raise InputError(f"{folder} holds none of the exchange files; accepted: {', '.join(FILES)}")
    return tables & set(FILES)


@contextmanager
def _any_length_of_cell() -> Iterator[None]:
    """The csv module gives up at a long cell without saying which; the columns have limits of their own."""
    before = csv.field_size_limit(CELL_LIMIT)
    try:
        yield
    finally:
        csv.field_size_limit(before)


def _read_file(path: Path, sheet: Sheet, zone: tzinfo | None, faults: Faults) -> Rows:
    rows = Rows(sheet, cells=[[] for _ in sheet.columns])
    if refused := _no_table(path):
        faults.add(rows.file, 0, refused)
        rows.unsure = True
        return rows
    try:
        # Bytes that are not UTF-8 come through as lone surrogates, and are refused cell by cell.
        with path.open(encoding="utf-8-sig", errors="surrogateescape", newline="") as stream:
            _read_stream(stream, rows, zone, faults)
    except OSError as why:
        faults.add(rows.file, 0, f"can't be read: {why.strerror}")
        rows.unsure = True
    return rows


def _no_table(path: Path) -> str | None:
    """Why the file isn't even opened: a pipe or a device has no end, and what is too large would fill the memory."""
    if not path.exists():  # a link that leads nowhere: opening it says so
        return None
    if not path.is_file():
        return "is a pipe or a device; accepted: a file"
    size = path.stat().st_size
    if size <= MOST_BYTES:
        return None
    return (
        f"{size / 1e9:.1f} GB are too many; accepted: up to {MOST_BYTES / 1e9:g} GB; make a folder for each part of the"
        " probes, with all that belongs to them, and import one after the other"
    )


def _read_stream(stream: TextIO, rows: Rows, zone: tzinfo | None, faults: Faults) -> None:
    reader = csv.reader(stream, strict=True)
    line, header = _header(reader, rows, faults)
    if not header:
        accepted = ",".join(column.name for column in rows.sheet.columns)
        faults.add(rows.file, 0, f"is empty; accepted: a header row such as {accepted}")
        return
    places = _places(header, line, rows, faults)
    if places is None:
        return
    readers = [CellReader(column, zone) if column.name in places else None for column in rows.sheet.columns]
    in_order = [places.get(column.name, 0) for column in rows.sheet.columns]
    for lines, records in _stretches(reader, header, rows, faults):
        _take_stretch(lines, list(zip(*records, strict=True)), in_order, readers, rows, faults)
    if any(column.required and column.name not in places for column in rows.sheet.columns):
        rows.faulty.update(range(len(rows.lines)))


def _take_stretch(
    lines: list[int],
    texts: list[tuple[str, ...]],
    places: list[int],
    readers: list[CellReader | None],
    rows: Rows,
    faults: Faults,
) -> None:
    start = len(rows.lines)
    rows.lines += lines
    for number, column in enumerate(rows.sheet.columns):
        reader = readers[number]
        if reader is None:
            rows.cells[number] += [None] * len(lines)
        else:
            values = reader.read(texts[places[number]])
            rows.cells[number] += _without_refusals(values, column, start, rows, faults)


def _header(reader: Any, rows: Rows, faults: Faults) -> tuple[int, list[str]]:
    """The first line with something on it, and where it stands."""
    while True:
        line = reader.line_num + 1
        try:
            cells = next(reader, None)
        except csv.Error as why:
            _refuse_csv(line, why, rows, faults)
            continue
        if cells or cells is None:
            return line, cells or []


def _stretches(
    reader: Any, header: list[str], rows: Rows, faults: Faults
) -> Iterator[tuple[list[int], list[list[str]]]]:
    """The line on which each row begins, and its cells, many at a time; lines with nothing on them say nothing.

    Rows that can't be told apart from the header, or laid out along it, are reported and left out.
    """
    ended = False
    while not ended:
        lines: list[int] = []
        records: list[list[str]] = []
        line = reader.line_num + 1
        try:
            for cells in islice(reader, CHUNK):
                lines.append(line)
                records.append(cells)
                line = reader.line_num + 1
            ended = len(records) < CHUNK
        except csv.Error as why:
            _refuse_csv(line, why, rows, faults)
        if header in records or set(map(len, records)) != {len(header)}:
            lines, records = _laid_out(lines, records, header, rows, faults)
        if records:
            yield lines, records


def _laid_out(
    lines: list[int], records: list[list[str]], header: list[str], rows: Rows, faults: Faults
) -> tuple[list[int], list[list[str]]]:
    kept = []
    for line, cells in zip(lines, records, strict=True):
        if len(cells) == len(header) and cells != header:
            kept.append((line, cells))
        elif cells:
            _refuse_shape(line, cells, header, rows, faults)
    return [line for line, _ in kept], [cells for _, cells in kept]


def _refuse_csv(line: int, why: csv.Error, rows: Rows, faults: Faults) -> None:
    faults.add(rows.file, line, f"this is no row of CSV ({why}); accepted: quotes doubled and closed (RFC 4180)")
    rows.unsure = True


def _refuse_shape(line: int, cells: list[str], header: list[str], rows: Rows, faults: Faults) -> None:
    if cells == header:
        faults.add(rows.file, line, "the header stands here again; accepted: a row")
        return
    found = "1 cell" if len(cells) == 1 else f"{len(cells)} cells"
    faults.add(rows.file, line, f"found {found}; accepted: {len(header)}, as many as the header has")
    rows.unsure = True


def _places(header: list[str], line: int, rows: Rows, faults: Faults) -> dict[str, int] | None:
    """Where each known column stands; None when the header can't be one of this file."""
    places: dict[str, int] = {}
    names = [cell.strip() for cell in header]
    if any(name != printable(name) or "\x00" in name for name in names):
        faults.add(rows.file, line, "the header is not text in UTF-8; accepted: a CSV file saved as UTF-8")
        rows.unsure = True
        return None
    if len(names) == 1 and (mark := next((mark for mark in ";\t" if mark in header[0]), None)):
        faults.add(rows.file, line, f"columns are parted by {mark!r}; accepted: commas (RFC 4180), . as decimal mark")
        rows.unsure = True
        return None
    for place, name in enumerate(names):
        if name in places:
            faults.add(rows.file, line, f"the column '{name}' stands here twice; accepted: once")
        elif name in rows.sheet.by_name:
            places[name] = place
        else:
            faults.add(rows.file, line, _unknown_column(name, place, rows.sheet))
    missing = [column for column in rows.sheet.columns if column.required and column.name not in places]
    for column in missing:
        faults.add(rows.file, line, f"{column.name}: this column is missing; {with_article(rows.sheet.one)} needs it")
    rows.unsure |= any(column.name in rows.sheet.key[:1] for column in missing)
    rows.present = frozenset(places)
    return places


def _unknown_column(name: str, place: int, sheet: Sheet) -> str:
    if not name:
        return f"column {place + 1} has no name; accepted: {', '.join(sheet.by_name)}"
    return f"{shortened(name)}: " + unknown(f"column of {sheet.name}.csv", name, sheet.by_name).message


def _without_refusals(values: list[Any], column: Column, start: int, rows: Rows, faults: Faults) -> Sequence[Any]:
    """The values, each refused one reported and then unknown."""
    refused = {start + index: _said(why, column) for index, why in refusals(values)}
    for row in refused:
        values[row - start] = None
    if column.required and None in values:
        missing = f"{column.name}: missing; {with_article(rows.sheet.one)} needs it"
        for row in (start + index for index, value in enumerate(values) if value is None):
            refused.setdefault(row, missing)
    for row, why in refused.items():
        faults.add(rows.file, rows.lines[row], why)
        rows.faulty.add(row)
        rows.unsure |= column.name in rows.sheet.key[:1]
    return values


def _said(why: str, column: Column) -> str:
    if why != printable(why):
        return f"{column.name}: holds bytes that are not UTF-8; accepted: text in UTF-8"
    return why if why.startswith(column.name) else f"{column.name}: {why}"
