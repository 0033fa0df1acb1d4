"""The exported folder is a Tabular Data Package: checked by frictionless, the standard's own reference library."""

from __future__ import annotations

import json
import warnings
from pathlib import Path
from typing import Any

import pytest

from electrolog.record.datapackage import descriptor
from electrolog.record.exchange_in import import_folder
from electrolog.record.exchange_out import export_folder
from electrolog.record.sheets import SHEETS
from tests.record.exchange_folders import LAB, exported, new_record, take


@pytest.fixture
def package(tmp_path: Path) -> Path:
    record = new_record(tmp_path)
    take(record, tmp_path, dict(LAB))
    export_folder(record, tmp_path / "out")
    return tmp_path / "out"


def faults(package: Path) -> list[Any]:
    with warnings.catch_warnings():
        warnings.filterwarnings("ignore", module=r"(frictionless|pydantic|marko|jinja2|petl)\b.*")
        warnings.filterwarnings("ignore", category=DeprecationWarning)  # of what frictionless itself is built on
        from frictionless import validate

        return validate(str(package / "datapackage.json")).flatten(["type", "fieldName", "rowNumber", "note"])


def test_the_package_is_valid(package: Path) -> None:
    assert faults(package) == []


@pytest.mark.parametrize(
    ("file", "old", "new", "kind"),
    [
        ("electrodes.csv", b"\r\nP2,", b"\r\nP1,", "primary-key"),
        ("electrodes.csv", b"P1,B1", b"P1,B9", "foreign-key"),
        ("calibration_points.csv", b"10.2", b"ten", "type-error"),
        ("calibrations.csv", b",pre,", b",before,", "constraint-error"),
        ("exposures.csv", b"2026-01-06T10:00:00Z", b"a Tuesday", "type-error"),
        ("standards.csv", b"standard,analyte", b"analyte,standard", "incorrect-label"),
    ],
)
def test_the_package_says_enough_to_find_a_row_that_breaks_it(
    package: Path, file: str, old: bytes, new: bytes, kind: str
) -> None:
    path = package / file
    assert old in path.read_bytes()
    path.write_bytes(path.read_bytes().replace(old, new, 1))
    assert kind in {fault[0] for fault in faults(package)}


def test_it_describes_every_exchanged_column_in_its_order(package: Path) -> None:
    found = json.loads((package / "datapackage.json").read_text(encoding="utf-8"))
    assert found == descriptor()
    fields = {item["name"]: [field["name"] for field in item["schema"]["fields"]] for item in found["resources"]}
    assert fields == {sheet.name: [column.name for column in sheet.columns] for sheet in SHEETS if sheet.exchanged}
    for item in found["resources"]:
        header = (package / item["path"]).read_text(encoding="utf-8").splitlines()[0]
        assert header.split(",") == fields[item["name"]]


def test_a_number_says_its_unit(package: Path) -> None:
    points = next(item for item in descriptor()["resources"] if item["name"] == "calibration_points")
    assert [field["description"] for field in points["schema"]["fields"]][1:] == [
        "concentration, in µM",
        "current, in nA",
    ]


def test_two_exports_have_the_same_bytes_and_the_description_is_no_table(tmp_path: Path, package: Path) -> None:
    other = new_record(tmp_path, "other.db")
    import_folder(other, package)
    assert exported(other, tmp_path / "out2") == {path.name: path.read_bytes() for path in package.iterdir()}
