"""A probe's papers beside a recording in CSV, NPY or HDF5: a folder of tables, the converted series in its kind."""

from __future__ import annotations

import csv
from pathlib import Path
from typing import Any

import h5py
import numpy as np
import pytest

from electrolog.lab import open_lab
from tests.cli.recordings import sha256
from tests.cli.test_enclose_nwb import ASKED, CURRENT_NA, RUN, TIME_S, TRUTH_UM


@pytest.fixture
def recording(tmp_path: Path) -> Path:
    """Of probe R1's run, as CSV."""
    path = tmp_path / "rec-R1.csv"
    rows = ["time_s,current_na", *(f"{t},{i!r}" for t, i in zip(TIME_S, CURRENT_NA.tolist(), strict=True))]
    path.write_text("\n".join(rows) + "\n", encoding="utf-8")
    return path


def rows(path: Path) -> list[dict[str, str]]:
    with path.open(encoding="utf-8", newline="") as file:
        return list(csv.DictReader(file))


def test_the_folder_says_what_the_record_says(judged: Any, recording: Path) -> None:
    before = sha256(recording)
    out = judged.ok("enclose", "rec-R1.csv", *ASKED).out
    assert "rec-R1.csv itself is untouched" in out
    assert sha256(recording) == before
    folder = recording.with_name("rec-R1.enclosed") / "R1"
    assert {path.name for path in folder.iterdir()} == {
        *("electrode.csv", "calibrations.csv", "calibration_points.csv", "factor.csv", "verdict.csv", "reasons.csv"),
        *("origin.csv", "columns.csv"),
    }
    (factor,) = rows(folder / "factor.csv")
    reading = open_lab(judged.db).readings(["R1"])[0]
    assert float(factor["sensitivity_na_um"]) == reading.figures.sensitivity_na_um
    assert (factor["calibration"], factor["in_force"]) == ("R1/0", "yes")
    assert rows(folder / "verdict.csv")[0]["verdict"] == "fit"
    assert rows(folder / "origin.csv")[0]["recording_sha256"] == before
    meanings = {(row["file"], row["column"]): row["meaning"] for row in rows(folder / "columns.csv")}
    for path in folder.iterdir():
        if path.name != "columns.csv":
            assert all((path.name, column) in meanings for column in rows(path)[0])
    assert meanings["factor.csv", "low_na_um"].endswith("in nA/µM")


@pytest.mark.parametrize("kind", ["csv", "npy", "h5"])
def test_the_concentration_is_written_in_the_recordings_own_kind(judged: Any, recording: Path, kind: str) -> None:
    path = recording.with_suffix(f".{kind}")
    if kind == "npy":
        np.save(path, CURRENT_NA)
    elif kind == "h5":
        with h5py.File(path, "w") as file:
            file["time_s"], file["current_na"] = TIME_S, CURRENT_NA
    rate = ("--rate", "0.5") if kind == "npy" else ()
    judged.ok("enclose", path.name, *ASKED, "--convert", "--unit", "nM", *rate)
    result = path.with_name("rec-R1.enclosed") / "R1" / f"concentration.{kind}"
    if kind == "h5":
        with h5py.File(result) as file:
            found = {name: file[name][()] for name in file}
    else:
        table = np.load(result) if kind == "npy" else np.genfromtxt(result, delimiter=",", names=True)
        found = {name: table[name] for name in table.dtype.names}
    assert set(found) == {"time_s", "current_na", "concentration_nm", "low_nm", "high_nm"}
    np.testing.assert_allclose(found["time_s"], TIME_S)
    assert np.abs(found["concentration_nm"] / (TRUTH_UM * 1000) - 1).max() < 0.05
    assert (found["low_nm"] < found["concentration_nm"]).all()


def test_the_run_is_found_by_the_list_or_by_what_is_typed(judged: Any, recording: Path) -> None:
    recording.rename(recording.with_name("a.csv"))
    judged.ok("enclose", "a.csv", *ASKED, "--convert")  # the only run of this probe
    late = (RUN.replace(year=RUN.year + 1)).isoformat()
    (recording.parent / "recordings.csv").write_text(f"file,probe,start\na.csv,R1,{late}\n", encoding="utf-8")
    assert "its run isn't on record" in judged.refused("enclose", "a.csv", *ASKED, "--convert", "--again")
    text = f"file,probe,start\na.csv,r1,{RUN.isoformat()}\n"
    (recording.parent / "recordings.csv").write_text(text, encoding="utf-8")
    told = judged.ok("enclose", "a.csv", "-a", "dopamine", "--convert", "--again", "--json").json
    assert told["electrode"] == "R1"
    assert told["exposure"] == next(
        r["id"] for r in open_lab(judged.db).rows("exposures") if r["recording"] == "rec-R1"
    )
    (recording.parent / "recordings.csv").write_text(text + f"a.csv,R2,{RUN.isoformat()}\n", encoding="utf-8")
    assert "recordings.csv names r1, R2: which probe is it?" in judged.refused("enclose", "a.csv", "-a", "dopamine")
    (recording.parent / "recordings.csv").unlink()
    said = judged.refused("enclose", "a.csv", "-a", "dopamine", "-p", "G0-0")
    assert "which exposure is it?" in said
    judged.ok("new", "Z1")
    assert "when did it begin?" in judged.refused("enclose", "a.csv", "-a", "dopamine", "-p", "Z1")


def test_papers_lie_there_once_and_again_leaves_what_isnt_ours(judged: Any, recording: Path) -> None:
    judged.ok("enclose", "rec-R1.csv", *ASKED, "--convert")
    folder = recording.with_name("rec-R1.enclosed") / "R1"
    assert "lie there already -- --again" in judged.refused("enclose", "rec-R1.csv", *ASKED)
    judged.ok("enclose", "rec-R1.csv", *ASKED, "--again")
    assert not (folder / "concentration.csv").exists()
    (folder / "my notes.txt").write_text("mine", encoding="utf-8")
    said = judged.refused("enclose", "rec-R1.csv", *ASKED, "--again")
    assert "holds what isn't ours: my notes.txt" in said
    assert (folder / "electrode.csv").is_file()
    judged.ok("enclose", "rec-R1.csv", "-a", "dopamine", "-p", "R2", "--start", RUN.isoformat())
    assert sorted(path.name for path in folder.parent.iterdir()) == ["R1", "R2"]


def test_the_label_is_told_by_the_papers_that_lie_beside(judged: Any, recording: Path) -> None:
    recording.rename(recording.with_name("a.csv"))
    judged.ok("enclose", "a.csv", *ASKED)
    judged.ok("enclose", "a.csv", "-a", "dopamine", "--again")
    (recording.parent / "recordings.csv").write_text(f"file,start\na.csv,{RUN.isoformat()}\n", encoding="utf-8")
    (run,) = judged.ok("runs", ".", "--setting", "in-vivo", "--json").json["runs"]
    assert (run["electrode"], run["electrode_from"]) == ("R1", "its own entry")


@pytest.mark.parametrize(
    ("options", "said"),
    [
        (("--in-place",), "papers lie beside such a file"),
        (("--convert", "--series", "current"), "papers lie beside such a file"),
        (("--probe", "R9"), "no probe is called 'R9'"),
    ],
)
def test_what_makes_no_sense_here_is_refused(judged: Any, recording: Path, options: tuple[str, ...], said: str) -> None:
    assert said in judged.refused("enclose", "rec-R1.csv", *ASKED, *options)
    assert not recording.with_name("rec-R1.enclosed").exists()


def test_a_file_of_another_kind_or_a_bad_one_is_refused(judged: Any, recording: Path) -> None:
    recording.with_name("a.txt").write_text("x", encoding="utf-8")
    assert "'.txt' is no kind of recording; accepted: .nwb, .csv" in judged.refused("enclose", "a.txt", *ASKED)
    recording.write_text("time_s,current_na\n1,2\n2,x\n", encoding="utf-8")
    assert "rec-R1.csv: line 3, column 2: 'x' is not a number" in judged.refused(
        "enclose", "rec-R1.csv", *ASKED, "--convert"
    )
    assert not recording.with_name("rec-R1.enclosed").exists()


def test_a_cell_that_a_spreadsheet_would_run_is_made_text(judged: Any, recording: Path) -> None:
    judged.ok("new", "Z1", "--batch", "=1+1")
    judged.ok("enclose", "rec-R1.csv", "-a", "dopamine", "-w", "triangle", "-p", "Z1", "--start", RUN.isoformat())
    (row,) = rows(recording.with_name("rec-R1.enclosed") / "Z1" / "electrode.csv")
    assert row["batch"] == "'=1+1"
