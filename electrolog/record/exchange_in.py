"""Importing an exchange folder: one transaction, every row or none, every fault at once."""

from __future__ import annotations

import gc
from collections.abc import Iterator, Mapping
from contextlib import contextmanager
from dataclasses import dataclass
from datetime import tzinfo
from pathlib import Path

from electrolog.record import sheets
from electrolog.record.exchange_faults import Faults, printable
from electrolog.record.exchange_files import Progress, Rows, read_folder
from electrolog.record.exchange_merge import Import, SheetMerge
from electrolog.record.exchange_points import FilePoints
from electrolog.record.sheets import SHEETS
from electrolog.record.store import Record


@dataclass(frozen=True)
class SheetReport:
    sheet: str
    added: int
    already_there: int
    filled_in: int


@dataclass(frozen=True)
class ImportReport:
    folder: str
    sheets: tuple[SheetReport, ...]  # one for each file found, in the order of the exchange files
    notes: tuple[str, ...]


def import_folder(
    record: Record, folder: Path, zone: tzinfo | None = None, progress: Progress | None = None
) -> ImportReport:
    """Adds what the folder knows to the record; times without an offset are read in `zone` (None: the machine's).

    Raises InputError when there is no such folder or nothing to read in it, FaultyRows with every fault of every
    row; nothing is written then. `progress` is told what is under way and how many rows of it are done.
    """
    name = printable(folder.resolve().name or str(folder))
    faults = Faults()
    with _without_collecting():
        files = read_folder(folder, zone, faults, progress)
        with record.writing(f"import of {name}") as writer:
            under_way = Import(writer, faults, FilePoints(files.get(sheets.POINTS.name)))
            under_way.unsure = {sheet for sheet, rows in files.items() if rows.unsure}
            _take_all(under_way, files, progress)
            faults.refuse(name)
    return _report(name, under_way, files)


@contextmanager
def _without_collecting() -> Iterator[None]:
    """Millions of cells are held and none of them is garbage: looking for some would take half the time."""
    on = gc.isenabled()
    gc.disable()
    try:
        yield
    finally:
        if on:
            gc.enable()


def _take_all(under_way: Import, files: dict[str, Rows], progress: Progress | None) -> None:
    for sheet in SHEETS:
        if sheet is sheets.POINTS or not (sheet.name in files or _has_points_only(sheet, files)):
            continue
        rows = files.get(sheet.name) or Rows(sheet, cells=[[] for _ in sheet.columns])
        merge = SheetMerge(under_way, rows)
        merge.take()
        if sheet is sheets.CALIBRATIONS:
            merge.take_strays()
        if progress:
            progress(f"take in {rows.file}", len(rows.lines))


def _has_points_only(sheet: sheets.Sheet, files: Mapping[str, Rows]) -> bool:
    return sheet is sheets.CALIBRATIONS and sheets.POINTS.name in files


def _report(name: str, under_way: Import, files: Mapping[str, Rows]) -> ImportReport:
    found = [(sheet, under_way.counts[sheet]) for sheet in files]
    reports = tuple(SheetReport(sheet, counts.added, counts.there, counts.filled) for sheet, counts in found)
    return ImportReport(name, reports, tuple(under_way.notes))
