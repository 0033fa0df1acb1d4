"""The day of a run in a row that only dates the calibrations before and after it."""

from __future__ import annotations

from datetime import UTC
from pathlib import Path

import pytest

from electrolog.lab import Lab, open_lab

HEADS = "Probe,Pre Date,Pre nA/uM,Post Date,Post nA/uM,Run (h)"
USUAL = {"analyte": "DA", "waveform": "triangle", "setting": "in-vivo"}


@pytest.fixture
def lab(tmp_path: Path) -> Lab:
    return open_lab(str(tmp_path / "lab.db"), zone=UTC, create=True)


def book(folder: Path, *rows: str) -> Path:
    path = folder / "runs.csv"
    path.write_text("\n".join([HEADS, *rows]), encoding="utf-8")
    return path


def starts(lab: Lab) -> list[str]:
    return sorted(row["start"].isoformat() for row in lab.rows("exposures"))


def test_a_run_between_calibrations_of_one_day_was_on_that_day(lab: Lab, tmp_path: Path) -> None:
    path = book(tmp_path, "K-1,2024-03-04 09:40,12,2024-03-04,9,3", "K-2,2024-03-06,12,,,2")
    assert lab.adopt(path, answers=USUAL, commit=True).questions == ()
    assert starts(lab) == ["2024-03-04T12:00:00+00:00", "2024-03-06T12:00:00+00:00"]
    at = [row["at"].isoformat()[11:16] for row in lab.rows("calibrations") if row["electrode"] == "K-1"]
    assert sorted(at) == ["09:40", "18:00"]


@pytest.mark.parametrize(("answer", "day"), [("pre", "2024-03-04"), ("post", "2024-03-05")])
def test_between_calibrations_of_two_days_it_is_asked(lab: Lab, tmp_path: Path, answer: str, day: str) -> None:
    path = book(tmp_path, "K-1,2024-03-04,12,2024-03-05,9,3")
    (asked,) = lab.adopt(path, answers=USUAL).questions
    assert (asked.key, asked.why) == ("run_day", "runs!B2 and runs!D2 differ")
    lab.adopt(path, answers={"run_day": answer}, commit=True)
    assert starts(lab) == [f"{day}T12:00:00+00:00"]
    stages = {row["stage"]: row["at"] for row in lab.rows("calibrations")}
    (run,) = lab.rows("exposures")
    assert stages["pre"] < run["start"] < stages["post"]


def test_one_cell_that_cannot_be_read_keeps_only_its_own_calibration_out(lab: Lab, tmp_path: Path) -> None:
    path = book(tmp_path, "K-1,2024-03-04,12,2024-03-04,broke,3", "K-2,2024-03-06,what,,,")
    found = lab.adopt(path, answers=USUAL, commit=True)
    refused = {one.place: one.said for one in found.remarks if one.kind == "refused"}
    assert refused["runs!A2:F2"].startswith("runs!E2: sensitivity: 'broke' is not a number")
    assert refused["runs!A2:F2"].endswith("; the rest of the row is taken")
    assert not refused["runs!A3:F3"].endswith("taken")
    assert [row["electrode"] for row in lab.rows("electrodes")] == ["K-1"]
    (row,) = lab.rows("calibrations")
    assert (row["stage"], row["sensitivity_na_um"]) == ("pre", 12.0)
    assert row["note"].startswith("refused beside it: runs!E2: sensitivity: 'broke'")
    assert len(lab.rows("exposures")) == 1
