"""A probe's papers beside a recording in CSV, NPY or HDF5: a folder of CSV tables, and the converted series."""

from __future__ import annotations

import csv
import math
import re
import tempfile
from collections.abc import Mapping
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from electrolog.answers.recordings.papers import Papers
from electrolog.answers.recordings.tables import Table
from electrolog.errors import InputError

Floats = NDArray[np.float64]
COLUMNS = "columns.csv"
SERIES = "concentration"
_OURS = re.compile(
    r"(?:columns|electrode|calibrations|calibration_points|factor|verdict|reasons|origin|sensitivity|conversion)\.csv"
    r"|concentration\.(?:csv|npy|h5)"
)
_FORMULA = re.compile(r"[=+\-@\t\r]")


def folder_of(place: Path, label: str) -> Path:
    """One for each probe, since two may have recorded at a time."""
    return place / re.sub(r"[^\w.\-]", "_", label)


def refuse_there(place: Path, label: str, again: bool) -> None:
    """Before anything is computed. Raises InputError where the papers lie there already, or what isn't ours does."""
    folder = folder_of(place, label)
    if folder.exists():
        _refuse_strange(folder)
        if not again:
            raise InputError(f"{folder}: the papers of {label} lie there already", "--again makes them anew")


def write(place: Path, papers: Papers, series: Mapping[str, Floats], ending: str, replace: bool) -> None:
    """All of it or nothing. Raises InputError where it is there and isn't to be replaced, or isn't only ours."""
    refuse_there(place, papers.label, replace)
    folder = folder_of(place, papers.label)
    place.mkdir(exist_ok=True)
    with tempfile.TemporaryDirectory(prefix=".papers-", dir=place, ignore_cleanup_errors=True) as scratch:
        fresh = Path(scratch) / "new"
        fresh.mkdir()
        for table in papers.tables:
            _write_table(fresh / f"{table.name}.csv", table)
        _write_meanings(fresh / COLUMNS, papers)
        if series:
            write_series(fresh / f"{SERIES}{ending}", series)
        if folder.exists():
            folder.rename(Path(scratch) / "old")
        fresh.rename(folder)


def write_series(path: Path, series: Mapping[str, Floats]) -> None:
    """Columns of equal length (samples,) by their names, units in them, in the kind of file that the ending says."""
    if path.suffix == ".npy":
        named = np.empty(len(next(iter(series.values()))), dtype=[(name, float) for name in series])
        for name, values in series.items():
            named[name] = values
        np.save(path, named)
    elif path.suffix == ".h5":
        import h5py

        with h5py.File(path, "x") as file:
            for name, values in series.items():
                file[name] = values
    else:
        with path.open("w", encoding="utf-8", newline="") as text:
            text.write(",".join(series) + "\n")
            for row in zip(*(values.tolist() for values in series.values()), strict=True):
                text.write(",".join("" if math.isnan(value) else f"{value:.9g}" for value in row) + "\n")


def _refuse_strange(folder: Path) -> None:
    strange = sorted(path.name for path in folder.iterdir() if not _OURS.fullmatch(path.name))
    if strange:
        raise InputError(f"{folder} holds what isn't ours: {', '.join(strange[:5])}", "move it elsewhere first")


def _write_table(path: Path, table: Table) -> None:
    with path.open("w", encoding="utf-8", newline="") as file:
        writer = csv.writer(file)
        writer.writerow([column.name for column in table.columns])
        writer.writerows(zip(*([_cell(value) for value in column.values] for column in table.columns), strict=True))


def _write_meanings(path: Path, papers: Papers) -> None:
    with path.open("w", encoding="utf-8", newline="") as file:
        writer = csv.writer(file)
        writer.writerow(("file", "column", "meaning"))
        for table in papers.tables:
            writer.writerows((f"{table.name}.csv", column.name, column.about) for column in table.columns)


def _cell(value: str | float) -> str:
    if isinstance(value, float):
        return "" if math.isnan(value) else repr(value).removesuffix(".0")
    # A spreadsheet would run a cell that begins like a formula; the apostrophe keeps it text.
    return f"'{value}" if _FORMULA.match(value) else value
