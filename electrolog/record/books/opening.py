"""Opening a book: what kind of file it is by its bytes, and whether reading it is safe, before any of it is read."""

from __future__ import annotations

import csv
import hashlib
import io
import re
import zipfile
import zlib
from collections.abc import Iterator
from pathlib import Path
from typing import TYPE_CHECKING, Any

from electrolog.errors import InputError, shortened
from electrolog.record.books.grid import Book, Content, Grid, Spot, cell_name, tidy

if TYPE_CHECKING:
    from collections.abc import Mapping

    from electrolog.record.books.grid import Marks

MOST_BYTES = 64 * 2**20
MOST_UNPACKED = 512 * 2**20
MOST_CELLS = 8_000_000  # a sheet is held as a full rectangle: one cell in the far corner would fill all memory
MOST_MARKED = 16 * 2**20  # unpacked; above it colours and comments would take longer to read than all the rest
ACCEPTED = "accepted: .xlsx, .xls, .ods or .csv"
# What the library raises over an archive that was cut or overwritten.
BROKEN = (zipfile.BadZipFile, zlib.error, OSError, RuntimeError, NotImplementedError, EOFError, ValueError)
_ZIP, _COMPOUND = b"PK\x03\x04", b"\xd0\xcf\x11\xe0\xa1\xb1\x1a\xe1"
_CELL = re.compile(rb'<(?:\w+:)?c\b[^>]*?\br="([A-Z]{1,3})(\d{1,7})"')
_REPEATED = re.compile(rb'number-(rows|columns)-repeated="(\d+)"[^>]*?(/?)>')


def open_book(path: Path) -> Book:
    """The book at `path`, values only: formulas are never evaluated. Raises InputError for what can't be read."""
    content = _bytes(path)
    fingerprint = hashlib.sha256(content).hexdigest()
    kind = _kind(path, content)
    if kind == "csv":
        return Book(path.name, fingerprint, (Grid(path.stem, tidy(list(_csv_rows(path, content)))),))
    marks: Mapping[str, Mapping[Spot, Marks]] = {}
    notes: tuple[str, ...] = ()
    if kind in ("xlsx", "ods"):
        unpacked = _refuse_bomb(path, content)
        if kind == "xlsx" and unpacked <= MOST_MARKED:
            from electrolog.record.books.marks import marks_of

            marks = marks_of(content)
        else:
            notes = ("colour, strikethrough and comments were not looked at: they are read from an .xlsx of 16 MB",)
    else:
        notes = ("colour, strikethrough and comments were not looked at: save the book as .xlsx to have them told",)
    grids = tuple(_grids(path, content, marks))
    hidden = tuple(f"the sheet '{grid.name}' is hidden, and was read like any other" for grid in grids if grid.hidden)
    return Book(path.name, fingerprint, grids, notes + hidden)


def _bytes(path: Path) -> bytes:
    try:
        size = path.stat().st_size
        if path.is_dir():
            raise InputError(
                f"{path.name} is a folder; {ACCEPTED}", "an exchange folder is read by `electrolog import`"
            )
        if size > MOST_BYTES:
            raise InputError(
                f"{path.name}: {size / 2**20:.0f} MB are too many; accepted: up to {MOST_BYTES // 2**20} MB",
                "save the sheets that matter as a book of their own; raw traces don't belong in it",
            )
        return path.read_bytes()
    except OSError as why:
        raise InputError(f"{path}: can't be read: {why.strerror}; {ACCEPTED}") from None


def _kind(path: Path, content: bytes) -> str:
    """By the bytes; where the name says something else, that is said: the wrong program would have saved it."""
    ending = path.suffix.lower().removeprefix(".")
    found = _kind_by_bytes(path, content)
    named = {"xlsx": "xlsx", "xlsm": "xlsx", "xls": "xls", "ods": "ods", "csv": "csv", "tsv": "csv", "txt": "csv"}.get(
        ending
    )
    if named != found:
        name = f".{shortened(ending, 20)}" if ending else "without an ending"
        raise InputError(
            f"{path.name}: is named {name} and holds {found}; accepted: a name that says what it is",
            f"rename it to {path.stem}.{found}, or save it anew from the spreadsheet program",
        )
    return found


def _kind_by_bytes(path: Path, content: bytes) -> str:
    if content.startswith(_COMPOUND):
        if "EncryptedPackage".encode("utf-16-le") in content:
            raise InputError(f"{path.name}: is locked by a password; accepted: a copy saved without one")
        return "xls"
    if content.startswith(_ZIP):
        return _kind_of_archive(path, content)
    if b"\x00" in content[:4096] and not content.startswith((b"\xff\xfe", b"\xfe\xff")):
        raise InputError(f"{path.name}: is no spreadsheet; {ACCEPTED}")
    if not content.strip():
        raise InputError(f"{path.name}: is empty; {ACCEPTED}")
    return "csv"


def _kind_of_archive(path: Path, content: bytes) -> str:
    names = {info.filename for info in _members(path, content)}
    if "xl/workbook.xml" in names:
        return "xlsx"
    if "content.xml" in names:
        if b"encryption-data" in _opened(path, content).read("META-INF/manifest.xml"):
            raise InputError(f"{path.name}: is locked by a password; accepted: a copy saved without one")
        return "ods"
    raise InputError(f"{path.name}: is an archive, but no spreadsheet of a known kind; {ACCEPTED}")


def _opened(path: Path, content: bytes) -> zipfile.ZipFile:
    try:
        return zipfile.ZipFile(io.BytesIO(content))
    except BROKEN:
        raise InputError(f"{path.name}: is damaged; accepted: a whole file", "save it anew") from None


def _members(path: Path, content: bytes) -> list[zipfile.ZipInfo]:
    with _opened(path, content) as archive:
        return archive.infolist()


def _refuse_bomb(path: Path, content: bytes) -> int:
    """The unpacked size. Raises InputError where reading would fill the memory, whatever the file's headers say."""
    total = 0
    with _opened(path, content) as archive:
        for info in archive.infolist():
            total += _streamed(path, archive, info, MOST_UNPACKED - total)
    return total


def _streamed(path: Path, archive: zipfile.ZipFile, info: zipfile.ZipInfo, room: int) -> int:
    size, tail, corner = 0, b"", _Corner(path, info.filename)
    unpacked = archive.open  # gives bytes, for which there is no encoding to name
    try:
        with unpacked(info) as stream:
            while chunk := stream.read(2**20):
                size += len(chunk)
                if size > room:
                    raise InputError(
                        f"{path.name}: its {path.stat().st_size} bytes unpack to more than {MOST_UNPACKED // 2**20} MB;"
                        " accepted: a book of values"
                    )
                corner.look(tail + chunk)
                tail = chunk[-200:]
    except BROKEN as why:
        raise InputError(f"{path.name}: its part {shortened(info.filename, 60)} can't be unpacked ({why})") from None
    return size


class _Corner:
    """The farthest cell of one sheet as it streams by."""

    def __init__(self, path: Path, part: str) -> None:
        self.path, self.part = path, part
        self.row = self.column = 0
        self.longest = {b"rows": 1, b"columns": 1}

    def look(self, piece: bytes) -> None:
        if self.part.startswith("xl/worksheets/"):
            for letters, digits in _CELL.findall(piece):
                self.row, self.column = max(self.row, int(digits)), max(self.column, _column_number(letters))
            self._refuse(self.row, self.column)
        elif self.part == "content.xml":
            self._look_at_repeats(piece)

    def _look_at_repeats(self, piece: bytes) -> None:
        """An empty cell's repeat stands for the sheet's blank rest; that of a filled one is real."""
        for what, digits, closed in _REPEATED.findall(piece):
            if what == b"columns" and not closed:
                self.longest[what] = max(self.longest[what], int(digits))
        if self.longest[b"columns"] > 16_384 // 4:
            self._refuse(MOST_CELLS, self.longest[b"columns"])

    def _refuse(self, rows: int, columns: int) -> None:
        if rows * columns > MOST_CELLS:
            corner = cell_name(rows - 1, columns - 1)
            raise InputError(
                f"{self.path.name}: a sheet ({self.part}) reaches to cell {corner};"
                f" accepted: up to {MOST_CELLS} cells, filled or not",
                "delete the empty rows and columns behind the data, and save",
            )


def _column_number(letters: bytes) -> int:
    number = 0
    for letter in letters:
        number = number * 26 + letter - 64
    return number


def _grids(path: Path, content: bytes, marks: Mapping[str, Mapping[Spot, Marks]]) -> Iterator[Grid]:
    calamine = _reader()
    try:
        book = calamine.CalamineWorkbook.from_filelike(io.BytesIO(content))
        for meta in book.sheets_metadata:
            if meta.typ == calamine.SheetTypeEnum.WorkSheet:
                sheet = book.get_sheet_by_name(meta.name)
                rows: list[list[Content]] = sheet.to_python(skip_empty_area=False)
                spans = _spans(sheet.merged_cell_ranges or ())
                hidden = meta.visible != calamine.SheetVisibleEnum.Visible
                yield Grid(meta.name, tidy(rows), spans, marks.get(meta.name, {}), hidden)
    except calamine.PasswordError:
        raise InputError(f"{path.name}: is locked by a password; accepted: a copy saved without one") from None
    except calamine.CalamineError as why:
        raise InputError(f"{path.name}: can't be read as a spreadsheet ({shortened(str(why))}); {ACCEPTED}") from None


def _reader() -> Any:
    try:
        import python_calamine
    except ModuleNotFoundError:
        raise InputError(
            "spreadsheets need a reader that is not installed",
            "install it with: python -m pip install python-calamine openpyxl; .csv needs none",
        ) from None
    return python_calamine


def _spans(ranges: Any) -> dict[Spot, Spot]:
    return {
        (row, column): first
        for first, last in ranges
        if (last[0] - first[0] + 1) * (last[1] - first[1] + 1) <= 10_000
        for row in range(first[0], last[0] + 1)
        for column in range(first[1], last[1] + 1)
    }


def _csv_rows(path: Path, content: bytes) -> Iterator[list[Content]]:
    text = _decoded(content)
    try:
        for row in csv.reader(io.StringIO(text, newline=""), delimiter=_delimiter(text)):
            yield list(row)
    except csv.Error as why:
        raise InputError(f"{path.name}: is no CSV ({why}); accepted: rows with commas, semicolons or tabs") from None


def _decoded(content: bytes) -> str:
    if content.startswith((b"\xff\xfe", b"\xfe\xff")):
        return content.decode("utf-16", "replace")
    try:
        return content.decode("utf-8-sig")
    except UnicodeDecodeError:  # what spreadsheet programs on Windows save when asked for CSV
        return content.decode("cp1252", "replace")


def _delimiter(text: str) -> str:
    """The one that splits most lines into the same number of cells, more than one; a decimal comma stays inside."""
    lines = [line for line in text.splitlines()[:50] if line.strip()]
    return max(";\t,|", key=lambda sign: (min(2, _usual(lines, sign)), -";\t,|".index(sign)))


def _usual(lines: list[str], sign: str) -> float:
    counts = sorted(line.count(sign) for line in lines)
    return counts[len(counts) // 2] if counts else 0
