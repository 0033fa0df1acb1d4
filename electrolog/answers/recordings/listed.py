"""`recordings.csv` in a folder of recordings: a row for each, with what its file can't tell."""

from __future__ import annotations

import csv
import io
from collections.abc import Iterable, Mapping
from dataclasses import dataclass
from datetime import datetime, tzinfo
from pathlib import Path

from electrolog.answers.recordings.told import Told
from electrolog.clock import parse_iso
from electrolog.errors import InputError, shortened, unknown
from electrolog.record.columns import Number
from electrolog.texts import small_text
from electrolog.units import FREQUENCY_HZ, SECONDS

LIST = "recordings.csv"
COLUMNS = {
    "file": "the recording, from this folder",
    "probe": "which probe recorded it; a row for each probe where there were several",
    "start": "when its first sample was taken, ISO 8601",
    "duration_s": "how long it lasted; not needed where the file holds times, or a rate is given",
    "rate_hz": "samples per second, of a file that holds currents alone",
    "subject": "the lab's own code of the preparation",
    "setting": "in-vivo, slice, flow-cell, or a word of the lab's",
    "waveform": "waveform applied",
    "medium": "what it was in",
    "by": "who did it",
    "note": "anything else worth keeping",
}
_DURATION = Number("duration_s", COLUMNS["duration_s"], unit=SECONDS, above=0, most=3e8)
_RATE = Number("rate_hz", COLUMNS["rate_hz"], unit=FREQUENCY_HZ, above=0)


@dataclass(frozen=True)
class Listed:
    """A row of the list: its cells by column, only those that say something."""

    line: int
    cells: Mapping[str, str]

    @property
    def file(self) -> str:
        return self.cells.get("file", "").replace("\\", "/")

    def text(self, name: str) -> str | None:
        return self.cells.get(name)

    def told(self, zone: tzinfo | None) -> Told:
        """Raises InputError for a start or a length that can't be read."""
        text = self.cells.get("start")
        start = None if text is None else parse_iso(text, zone, f"{LIST} line {self.line}, start")
        assumed = text is not None and datetime.fromisoformat(text).tzinfo is None
        return Told(start, self._number(_DURATION), subject=self.cells.get("subject"), zone_assumed=assumed)

    def rate_hz(self) -> float | None:
        return self._number(_RATE)

    def _number(self, column: Number) -> float | None:
        text = self.cells.get(column.name)
        if text is None:
            return None
        try:
            return float(column.read(text))  # type: ignore[arg-type]
        except InputError as why:
            raise InputError(f"{LIST} line {self.line}, {why.message}", why.hint) from None


def read_list(folder: Path) -> list[Listed]:
    """The rows of the folder's list; none where there is no list. Raises InputError for one that can't be read."""
    path = folder / LIST
    if not path.exists():
        return []
    if not path.is_file():
        raise InputError(f"{LIST}: is a folder, a pipe or a device; accepted: a file, CSV in UTF-8")
    text = small_text(path, "CSV in UTF-8")
    mark = max(",;\t", key=text.partition("\n")[0].count)
    reader = csv.reader(io.StringIO(text, newline=""), delimiter=mark, strict=True)
    try:
        rows = [(reader.line_num, cells) for cells in reader]
    except csv.Error as why:
        raise InputError(f"{LIST}: can't be read ({shortened(str(why), 120)}); accepted: CSV in UTF-8") from None
    if not rows:
        raise InputError(f"{LIST}: is empty; accepted: a header row such as {','.join(COLUMNS)}")
    names = _names(rows[0][1])
    return [_row(line, names, cells) for line, cells in rows[1:] if any(map(str.strip, cells))]


def _names(header: list[str]) -> list[str]:
    names = [cell.strip().casefold() for cell in header]
    for name in names:
        if name not in COLUMNS:
            raise unknown(f"column of {LIST}", name, COLUMNS, f"accepted: {', '.join(COLUMNS)}")
        if names.count(name) > 1:
            raise InputError(f"{LIST}: the column '{name}' stands there twice; accepted: once")
    if "file" not in names:
        raise InputError(f"{LIST}: has no column 'file'; accepted: {', '.join(COLUMNS)}")
    return names


def _row(line: int, names: list[str], cells: list[str]) -> Listed:
    if len(cells) != len(names):
        raise InputError(f"{LIST} line {line}: found {len(cells)} cells; accepted: {len(names)}, as many as the header")
    row = Listed(line, {name: cell.strip() for name, cell in zip(names, cells, strict=True) if cell.strip()})
    if not row.file:
        raise InputError(f"{LIST} line {line}: names no file; accepted: a file of this folder")
    return row


def write_list(folder: Path, rows: Iterable[Mapping[str, str]]) -> Path:
    """A new list with these cells, for a person to fill in. Raises InputError where there is one already."""
    path = folder / LIST
    try:
        with path.open("x", encoding="utf-8", newline="") as file:
            writer = csv.DictWriter(file, list(COLUMNS), restval="")
            writer.writeheader()
            writer.writerows(rows)
    except FileExistsError:
        raise InputError(
            f"{path.name} is there already, and nothing is overwritten", "fill it in, or move it"
        ) from None
    return path
