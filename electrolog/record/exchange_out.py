"""Exporting the record as an exchange folder: live rows only, their order and bytes decided by the content alone."""

from __future__ import annotations

import csv
import io
import json
from collections.abc import Callable, Iterable, Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from sqlalchemy import Connection, select

from electrolog.errors import RecordError
from electrolog.record import columns as kinds
from electrolog.record import schema, sheets
from electrolog.record.builtin import WORDS
from electrolog.record.columns import Column, number_text
from electrolog.record.datapackage import DESCRIPTOR_FILE, descriptor
from electrolog.record.exchange_files import CHUNK, Progress
from electrolog.record.sheets import SHEETS, Sheet
from electrolog.record.store import Record

Labels = dict[str, dict[int, str]]  # of each sheet, row number -> name


@dataclass(frozen=True)
class ExportReport:
    folder: str
    rows: dict[str, int]  # sheet -> rows written
    kind: str = "csv"


def export_folder(record: Record, folder: Path, progress: Progress | None = None) -> ExportReport:
    """Writes every exchange file, also those without rows, and datapackage.json; other files are left alone.

    Raises RecordError when the folder can't be made or written. Each file is replaced whole or not at all.
    """
    counts: dict[str, int] = {}
    try:
        folder.mkdir(parents=True, exist_ok=True)
        with record.reading() as connection:
            labels: Labels = {}
            for sheet in (sheet for sheet in SHEETS if sheet.exchanged):
                rows = _rows(connection, sheet, labels)
                _replace(folder / f"{sheet.name}.csv", _csv(sheet, rows, labels))
                counts[sheet.name] = len(rows)
                if progress:
                    progress(f"wrote {sheet.name}.csv", len(rows))
        _replace(folder / DESCRIPTOR_FILE, [json.dumps(descriptor(), ensure_ascii=False, indent=2) + "\n"])
    except FileExistsError:
        raise RecordError(f"{folder} is a file; accepted: a folder, there or not") from None
    except OSError as why:
        raise RecordError(f"{folder} can't be written: {why.strerror}") from None
    return ExportReport(str(folder), counts)


def _rows(connection: Connection, sheet: Sheet, labels: Labels) -> list[Any]:
    """The live rows in canonical order, as the table keeps them."""
    table = schema.tables[sheet.name]
    columns = [table.c[schema.column_name(column)] for column in sheet.columns]
    if sheet is sheets.POINTS:
        query = select(*columns).where(table.c.struck.is_(None)).order_by(table.c.calibration_id, table.c.ordinal)
        names = labels["calibrations"]  # of live ones: the points of a struck calibration go with it
        rows = [row for row in connection.execute(query).all() if row[0] in names]
        rows.sort(key=lambda row: names[row[0]])  # a stable sort keeps the order of the points
        return rows
    found: Sequence[Any] = connection.execute(select(table.c.id, *columns).where(table.c.struck.is_(None))).all()
    if len(sheet.key) == 1 or sheet is sheets.ELECTRODES:
        place = 1 + list(sheet.by_name).index(sheet.key[0])
        labels[sheet.name] = {row[0]: row[place] for row in found}
    live = [tuple(row[1:]) for row in found]
    if sheet is sheets.TERMS:  # the lab's own: a built-in word needs no row
        live = [row for row in live if row[1].casefold() not in map(str.casefold, WORDS[row[0]])]
    return sorted(live, key=_order(sheet, labels))


def _order(sheet: Sheet, labels: Labels) -> Callable[[Sequence[Any]], Any]:
    """By key, names in the order of their code points whatever the database's own collation is."""
    places = [(list(sheet.by_name).index(name), sheet.by_name[name]) for name in sheet.key]
    parts = [(place, labels[column.to] if isinstance(column, kinds.Link) else None) for place, column in places]
    return lambda row: [row[place] if names is None else names[row[place]] for place, names in parts]


def _csv(sheet: Sheet, rows: Sequence[Any], labels: Labels) -> Iterable[str]:
    yield _text([[column.name for column in sheet.columns]])
    for start in range(0, len(rows), CHUNK):
        by_column = zip(*rows[start : start + CHUNK], strict=True)
        cells = [_cells(column, values, labels) for column, values in zip(sheet.columns, by_column, strict=True)]
        yield _text(zip(*cells, strict=True))


def _text(rows: Iterable[Sequence[str]]) -> str:
    buffer = io.StringIO(newline="")
    csv.writer(buffer, lineterminator="\r\n").writerows(rows)  # RFC 4180
    return buffer.getvalue()


def _cells(column: Column, values: Sequence[Any], labels: Labels) -> list[str]:
    if isinstance(column, kinds.Link):
        names = labels[column.to]
        return ["" if value is None else names[value] for value in values]
    if isinstance(column, kinds.Number):
        written = {value: "" if value is None else number_text(value) for value in set(values)}  # levels repeat
        return [written[value] for value in values]
    if isinstance(column, kinds.Moment | kinds.Day):
        return [column.write(value) for value in values]
    return ["" if value is None else value for value in values]


def _replace(path: Path, parts: Iterable[str]) -> None:
    """Written beside and moved into place: whoever reads the folder never finds half a file."""
    beside = path.with_name(f".{path.name}.part")
    try:
        with beside.open("w", encoding="utf-8", newline="") as stream:
            stream.writelines(parts)
        beside.replace(path)
    finally:
        beside.unlink(missing_ok=True)
