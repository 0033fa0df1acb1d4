"""Parquet holds what the CSV files hold, with types and units, and is written a stretch of rows at a time."""

from __future__ import annotations

import csv
from datetime import UTC, date, datetime
from pathlib import Path
from typing import Any

import pandas as pd
import pytest
from pyarrow import parquet

from electrolog.errors import RecordError
from electrolog.lab import Lab
from electrolog.record import exchange_parquet, sheets
from electrolog.record.columns import Number
from electrolog.record.exchange_parquet import export_parquet
from electrolog.record.sheets import SHEETS, Sheet
from tests.record.exchange_folders import LAB, new_record, take

EXCHANGED = [sheet for sheet in SHEETS if sheet.exchanged]


def from_csv(path: Path, sheet: Sheet) -> list[dict[str, Any]]:
    with path.open(encoding="utf-8", newline="") as stream:
        return [
            {name: sheet.by_name[name].read(text, UTC) if text else None for name, text in row.items()}
            for row in csv.DictReader(stream)
        ]


def in_order(rows: list[dict[str, Any]]) -> list[dict[str, Any]]:
    """By their cells as a CSV has them; what is compared is the values themselves."""
    return sorted(
        rows,
        key=lambda row: [str(value.timestamp() if isinstance(value, datetime) else value) for value in row.values()],
    )


def test_it_reads_back_equal_to_the_csv_files(shared: Lab, tmp_path: Path) -> None:
    shared.export_folder(tmp_path / "csv")
    report = shared.export_parquet(tmp_path / "parquet")
    assert {path.name for path in (tmp_path / "parquet").iterdir()} == {f"{one.name}.parquet" for one in EXCHANGED}
    for sheet in EXCHANGED:
        rows = parquet.read_table(tmp_path / "parquet" / f"{sheet.name}.parquet").to_pylist()
        assert in_order(rows) == in_order(from_csv(tmp_path / "csv" / f"{sheet.name}.csv", sheet)), sheet.name
        assert report.rows[sheet.name] == len(rows)


def test_types_units_and_meanings_are_kept(shared: Lab, tmp_path: Path) -> None:
    shared.export_parquet(tmp_path)
    for sheet in EXCHANGED:
        fields = parquet.read_schema(tmp_path / f"{sheet.name}.parquet")
        assert fields.names == [column.name for column in sheet.columns]
        for column in sheet.columns:
            field = fields.field(column.name)
            assert field.nullable is not column.required
            assert field.metadata[b"description"].decode() == column.about
            if isinstance(column, Number):
                assert field.metadata.get(b"unit", b"").decode() == column.unit.sign
    frame = pd.read_parquet(tmp_path / "calibrations.parquet")
    assert str(frame["at"].dtype.tz) == "UTC"  # type: ignore[union-attr]
    assert frame["at"].min() == datetime(2026, 1, 7, 9, tzinfo=UTC)
    assert frame["noise_na"].dtype == "float64"
    assert parquet.read_table(tmp_path / "coatings.parquet")["layers"].to_pylist() == [3]
    assert parquet.read_table(tmp_path / "batches.parquet")["made_on"].to_pylist() == [date(2026, 1, 5)]


def test_a_struck_calibration_takes_its_points_along(lived_in: Lab, tmp_path: Path) -> None:
    first, second = (row["calibration"] for row in lived_in.rows("calibrations"))
    lived_in.strike("calibration", first, "another probe's")
    lived_in.export_parquet(tmp_path)
    points = parquet.read_table(tmp_path / "calibration_points.parquet")["calibration"].to_pylist()
    assert set(points) == {second}


def test_a_big_table_is_never_held_as_a_whole(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(exchange_parquet, "STRETCH", 2)
    record = new_record(tmp_path)
    take(record, tmp_path, dict(LAB))
    export_parquet(record, tmp_path / "out")
    file = parquet.ParquetFile(tmp_path / "out" / "calibration_points.parquet")
    groups = [file.metadata.row_group(place).num_rows for place in range(file.num_row_groups)]
    assert groups == [2, 2, 1]
    assert file.read()["calibration"].to_pylist() == ["C1", "C1", "C1", "C2", "C2"]
    assert file.read()["current_na"].to_pylist() == [10.2, 5.1, 10.1, 9.0, 18.25]


def test_a_sheet_without_rows_is_a_file_with_its_columns(tmp_path: Path) -> None:
    export_parquet(new_record(tmp_path), tmp_path / "out")
    table = parquet.read_table(tmp_path / "out" / "exposures.parquet")
    assert (table.num_rows, table.column_names) == (0, [column.name for column in sheets.EXPOSURES.columns])
    assert parquet.read_table(tmp_path / "out" / "terms.parquet").num_rows == 0


def test_a_file_in_the_folders_place_is_refused(shared: Lab, tmp_path: Path) -> None:
    (tmp_path / "taken").write_text("", encoding="utf-8")
    with pytest.raises(RecordError, match="is a file; accepted: a folder"):
        shared.export_parquet(tmp_path / "taken")
