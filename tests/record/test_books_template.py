"""The template is a book that adopt reads without a question, and whose cells refuse what adopt would."""

from __future__ import annotations

from datetime import UTC, date, time
from pathlib import Path

import openpyxl
import pytest

from electrolog.errors import InputError
from electrolog.lab import Lab, open_lab


@pytest.fixture
def lab(tmp_path: Path) -> Lab:
    return open_lab(str(tmp_path / "lab.db"), zone=UTC, create=True)


@pytest.fixture
def template(lab: Lab, tmp_path: Path) -> Path:
    path = tmp_path / "bench.xlsx"
    lab.write_template(path, [0.0, 0.25, 1.0])
    return path


def test_a_filled_template_comes_in_without_a_question(lab: Lab, template: Path) -> None:
    book = openpyxl.load_workbook(template)
    calibration = ["K-1", date(2024, 5, 2), time(9, 30), "pre", "dopamine", "triangle", "PBS", 37, "north", "wren"]
    for column, value in enumerate([*calibration, 0.1, 3.1, 12.2], start=1):
        book["Calibrations"].cell(2, column, value)
    run = ["K-1", date(2024, 5, 2), time(10, 15), 150, "in-vivo", "triangle", "R-1", "rec-1", "wren", "calm"]
    for column, value in enumerate(run, start=1):
        book["Runs"].cell(2, column, value)
    book.save(template)
    found = lab.adopt(template, commit=True)
    assert found.questions == ()
    assert [one for one in found.remarks if one.kind != "left out"] == []
    (made,) = lab.rows("calibrations")
    assert (made["at"].isoformat(), made["stage"], made["medium"]) == ("2024-05-02T09:30:00+00:00", "pre", "PBS")
    points = [(row["concentration_um"], row["current_na"]) for row in lab.rows("calibration_points")]
    assert points == [(0.0, 0.1), (0.25, 3.1), (1.0, 12.2)]
    (exposed,) = lab.rows("exposures")
    assert (exposed["start"].isoformat(), exposed["duration_min"]) == ("2024-05-02T10:15:00+00:00", 150)
    assert (exposed["setting"], exposed["subject"], exposed["recording"]) == ("in-vivo", "R-1", "rec-1")


def test_its_cells_take_the_labs_own_words_only(lab: Lab, tmp_path: Path) -> None:
    lab.log_plain("terms", {"kind": "medium", "term": "=brain phantom"})
    path = tmp_path / "own.xlsx"
    lab.write_template(path)
    book = openpyxl.load_workbook(path)
    words = [cell.value for cell in book["Words"]["D"] if cell.value]
    assert words[0] == "medium"
    assert "=brain phantom" in words
    assert all(cell.data_type == "s" for column in book["Words"].columns for cell in column if cell.value)
    rules = {str(rule.sqref): rule for rule in book["Calibrations"].data_validations.dataValidation}
    assert rules["G2:G501"].formula1 == f"Words!$D$2:$D${len(words)}"
    assert rules["B2:B501"].type == "date"


def test_a_book_that_may_be_filled_in_is_never_overwritten(lab: Lab, template: Path) -> None:
    before = template.read_bytes()
    with pytest.raises(InputError, match="is there already"):
        lab.write_template(template)
    assert template.read_bytes() == before
    with pytest.raises(InputError, match=r"\.xlsx"):
        lab.write_template(template.with_suffix(".csv"))
