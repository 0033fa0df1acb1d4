"""The exchange folder's rows as Parquet, for a lab too big for CSV: types and units kept, never held as a whole."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from pathlib import Path
from typing import Any

from sqlalchemy import Connection, Select, and_, exists, func

from electrolog.errors import ElectrologError, RecordError
from electrolog.record import columns as kinds
from electrolog.record import schema, sheets
from electrolog.record.builtin import WORDS
from electrolog.record.columns import Column
from electrolog.record.exchange_files import Progress
from electrolog.record.exchange_out import ExportReport
from electrolog.record.readable import readable
from electrolog.record.sheets import SHEETS, Sheet
from electrolog.record.store import Record

STRETCH = 20_000  # rows held at a time, and in one group of the file


def export_parquet(record: Record, folder: Path, progress: Progress | None = None) -> ExportReport:
    """One .parquet file for each sheet of the exchange folder: its live rows in the order in which they were entered.

    Numbers are doubles (whole ones int64), moments timestamps in UTC, days dates; what a column means and its unit
    stand in the file. Raises RecordError when the folder can't be written, ElectrologError without pyarrow.
    """
    _pyarrow()
    counts: dict[str, int] = {}
    try:
        folder.mkdir(parents=True, exist_ok=True)
        with record.reading() as connection:
            for sheet in (sheet for sheet in SHEETS if sheet.exchanged):
                counts[sheet.name] = _written(connection, sheet, folder / f"{sheet.name}.parquet")
                if progress:
                    progress(f"wrote {sheet.name}.parquet", counts[sheet.name])
    except FileExistsError:
        raise RecordError(f"{folder} is a file; accepted: a folder, there or not") from None
    except OSError as why:
        raise RecordError(f"{folder} can't be written: {why.strerror}") from None
    return ExportReport(str(folder), counts, "parquet")


def _written(connection: Connection, sheet: Sheet, path: Path) -> int:
    """Written beside and moved into place, as every file of an export; returns how many rows."""
    arrow, parquet = _pyarrow()
    fields = arrow.schema([_field(column) for column in sheet.columns], metadata={"description": sheet.about})
    beside = path.with_name(f".{path.name}.part")
    count = 0
    try:
        with parquet.ParquetWriter(beside, fields, compression="zstd") as writer:
            for rows in _stretches(connection, sheet):
                by_column = [list(values) for values in zip(*rows, strict=True)]
                arrays = [arrow.array(values, field.type) for values, field in zip(by_column, fields, strict=True)]
                writer.write_batch(arrow.record_batch(arrays, schema=fields))
                count += len(rows)
        beside.replace(path)
    finally:
        beside.unlink(missing_ok=True)
    return count


def _stretches(connection: Connection, sheet: Sheet) -> Iterator[Sequence[Any]]:
    found = connection.execute(_live(sheet), execution_options={"yield_per": STRETCH})
    places = [list(found.keys()).index(column.name) for column in sheet.columns]
    for rows in found.partitions():
        yield [[row[place] for place in places] for row in rows]


def _live(sheet: Sheet) -> Select[Any]:
    """The same rows as in the CSV files: no points of a struck calibration, no word that every record has."""
    table = schema.tables[sheet.name]
    if sheet is sheets.POINTS:
        whole = schema.tables["calibrations"]
        kept = exists().where(whole.c.id == table.c.calibration_id, whole.c.struck.is_(None))
        return readable(sheet).where(kept).order_by(table.c.calibration_id, table.c.ordinal)
    if sheet is sheets.TERMS:
        lists = [
            and_(table.c.kind == kind, func.lower(table.c.term).in_(map(str.lower, WORDS[kind]))) for kind in WORDS
        ]
        return readable(sheet).where(*[~one for one in lists]).order_by(table.c.id)
    return readable(sheet).order_by(table.c.id)


def _field(column: Column) -> Any:
    arrow, _ = _pyarrow()
    unit = column.unit.sign if isinstance(column, kinds.Number) else ""
    said = {"description": column.about} | ({"unit": unit} if unit else {})
    return arrow.field(column.name, _type(column), not column.required, said)


def _type(column: Column) -> Any:
    arrow, _ = _pyarrow()
    if isinstance(column, kinds.Number):
        return arrow.int64() if column.whole else arrow.float64()
    if isinstance(column, kinds.Moment):
        return arrow.timestamp("us", "UTC")
    return arrow.date32() if isinstance(column, kinds.Day) else arrow.string()


def _pyarrow() -> Any:
    try:
        import pyarrow as arrow
        from pyarrow import parquet
    except ModuleNotFoundError:
        raise ElectrologError(
            "Parquet needs pyarrow, which isn't installed", "install it with: python -m pip install pyarrow"
        ) from None
    return arrow, parquet
