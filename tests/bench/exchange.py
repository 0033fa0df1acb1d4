"""In and out: the exchange folder beside the least that could move the same rows."""

from __future__ import annotations

import csv
import sqlite3
from collections.abc import Iterator, Sequence
from contextlib import closing
from itertools import islice
from pathlib import Path

from electrolog.lab import open_lab
from tests.bench import labs
from tests.bench.line import Family, Line, ratio
from tests.bench.timing import by_turns

TABLES = ("electrodes", "calibrations", "calibration_points")
ROWS = 10_000


def moving() -> Iterator[Line]:
    folder = labs.import_folder()
    ours, plain = labs.scratch() / "imported.db", labs.scratch() / "plain.db"
    out, plainly_out = labs.scratch() / "exported", labs.scratch() / "plainly"
    plainly_out.mkdir()
    works = {
        "plain import": lambda: _plain_import(folder, plain),
        "import": lambda: _import(folder, ours),
        "plain export": lambda: _plain_export(plain, plainly_out),
        "export": lambda: open_lab(str(ours)).export_folder(out),
    }
    taken = by_turns(works)
    yield ratio(
        "import of 10⁵ calibrations with 5×10⁵ points, journalled",
        "csv.reader + sqlite3 executemany of the same rows",
        taken["import"],
        taken["plain import"],
        4,
    )
    against = "csv.writer over sqlite3 rows"
    yield ratio("export of the same", against, taken["export"], taken["plain export"], 3)


def _import(folder: Path, file: Path) -> None:
    _remove(file)
    open_lab(str(file), create=True).import_folder(folder)


def _plain_import(folder: Path, file: Path) -> None:
    """One table each, without a check or an index: text as it stands in the file, numbers as numbers."""
    _remove(file)
    with closing(sqlite3.connect(file)) as connection, connection:
        for table in TABLES:
            with (folder / f"{table}.csv").open(encoding="utf-8", newline="") as stream:
                rows = csv.reader(stream)
                header = next(rows)
                connection.execute(f"CREATE TABLE {table} ({', '.join(map(_column, header))})")
                fill = f"INSERT INTO {table} VALUES ({', '.join('?' * len(header))})"
                connection.executemany(fill, rows)


def _column(name: str) -> str:
    return f"{name} REAL" if name.endswith(("_um", "_na")) else f"{name} TEXT"


def _plain_export(file: Path, folder: Path) -> None:
    with closing(sqlite3.connect(file)) as connection:
        for table in TABLES:
            rows = connection.execute(f"SELECT * FROM {table}")
            with (folder / f"{table}.csv").open("w", encoding="utf-8", newline="") as stream:
                writer = csv.writer(stream)
                writer.writerow([name for name, *_ in rows.description])
                _write_all(writer, rows)


def _write_all(writer: object, rows: sqlite3.Cursor) -> None:
    while some := list(islice(rows, ROWS)):
        writer.writerows(some)  # type: ignore[attr-defined]


def _remove(file: Path) -> None:
    for old in _beside(file):
        old.unlink(missing_ok=True)


def _beside(file: Path) -> Sequence[Path]:
    return [file, *(file.with_name(file.name + end) for end in ("-wal", "-shm"))]


FAMILIES = (Family("exchange", moving),)
