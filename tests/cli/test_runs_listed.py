"""A folder without NWB: recordings.csv says what files in CSV, NPY and HDF5 can't, and corrects what NWB files say."""

from __future__ import annotations

import csv
import os
from datetime import timedelta
from pathlib import Path
from typing import Any

import h5py
import numpy as np
import pytest

from electrolog.answers.recordings.listed import COLUMNS
from electrolog.answers.recordings.span import span_s
from electrolog.errors import InputError
from electrolog.lab import open_lab
from tests.cli.recordings import BEGAN, sha256, write_nwb
from tests.cli.test_runs import HERE, exposures, said_of, states

TIME_S = np.arange(0.0, 3600.5, 0.5)
CURRENT_NA = np.full(TIME_S.size, 5.0)


def write_list(folder: Path, *rows: dict[str, str]) -> None:
    names = list(dict.fromkeys(name for row in rows for name in row))
    with (folder / "recordings.csv").open("w", encoding="utf-8", newline="") as file:
        writer = csv.DictWriter(file, names)
        writer.writeheader()
        writer.writerows(rows)


@pytest.fixture
def folder(tmp_path: Path) -> Path:
    """An hour in each kind of file."""
    rig = tmp_path / "rig"
    rig.mkdir()
    rows = ["time_s,current_na", *(f"{t},{i}" for t, i in zip(TIME_S, CURRENT_NA, strict=True))]
    (rig / "a.csv").write_text("\n".join(rows) + "\n", encoding="utf-8")
    np.save(rig / "b.npy", np.column_stack([TIME_S, CURRENT_NA]))
    np.save(rig / "c.npy", CURRENT_NA)
    with h5py.File(rig / "d.h5", "w") as file:
        file["run/time_s"], file["run/current_na"] = TIME_S, CURRENT_NA
    return rig


def row(file: str, day: int = 0, **cells: str) -> dict[str, str]:
    start = (BEGAN + timedelta(days=day)).isoformat()
    return {"file": file, "probe": "B9-01", "start": start, "rate_hz": "", "subject": "animal-9"} | cells


def test_each_kind_of_file_is_logged_by_its_own_length(cli: Any, folder: Path) -> None:
    write_list(folder, row("a.csv"), row("b.npy", 1), row("c.npy", 2, rate_hz="2"), row("d.h5", 3))
    assert set(states(cli.ok("runs", "rig", *HERE, "--commit", "--json")).values()) == {"new"}
    found = exposures(cli)
    assert [one["duration_min"] for one in found] == pytest.approx([60.0] * 4)
    assert [one["recording"] for one in found] == ["a", "b", "c", "d"]
    assert {one["subject"] for one in found} == {"animal-9"}
    (entry,) = open_lab(cli.db).journal("exposures", found[3]["id"])
    assert entry.reason == f"read from d.h5, SHA-256 {sha256(folder / 'd.h5')}"
    assert set(states(cli.ok("runs", "rig", *HERE, "--commit", "--json")).values()) == {"there already"}


def test_the_list_may_say_all_of_it(cli: Any, folder: Path) -> None:
    cells = {"duration_s": "5400", "setting": "slice", "waveform": "triangle", "medium": "aCSF", "by": "wren"}
    write_list(folder, row("c.npy", **cells, note="left side"))
    cli.ok("runs", "rig", "--commit")
    (one,) = exposures(cli)
    assert (one["duration_min"], one["setting"], one["medium"], one["by"]) == (90.0, "slice", "aCSF", "wren")
    assert one["note"].startswith("left side; from c.npy (")


def test_files_that_no_list_names_are_told_of_and_a_list_is_made(cli: Any, folder: Path) -> None:
    write_nwb(folder / "B9-02.nwb")
    out = " ".join(cli.ok("runs", "rig", *HERE).out.split())
    assert "only a list can tell of a.csv, b.npy, c.npy and 1 more" in out
    cli.ok("runs", "rig", "--list", "--setting", "slice")
    rows = list(csv.DictReader((folder / "recordings.csv").read_text(encoding="utf-8").splitlines()))
    assert [one["file"] for one in rows] == ["B9-02.nwb", "a.csv", "b.npy", "c.npy", "d.h5"]
    assert list(rows[0]) == list(COLUMNS)
    assert (rows[0]["probe"], rows[0]["setting"], rows[0]["start"]) == ("B9-02", "slice", "")
    assert "is there already, and nothing is overwritten" in cli.refused("runs", "rig", "--list")
    told = cli.ok("runs", "rig", "--json")
    assert states(told) == {"B9-02.nwb": "new"} | dict.fromkeys(("a.csv", "b.npy", "c.npy", "d.h5"), "refused")
    assert "when did it begin?" in said_of(told, "a.csv")


def test_what_the_list_says_goes_before_the_file_and_a_contradiction_is_named(cli: Any, folder: Path) -> None:
    write_nwb(folder / "B9-02.nwb")
    write_list(folder, {"file": "B9-02.nwb", "probe": "b9-03", "start": "2026-02-05T08:00Z", "subject": "animal-1"})
    (run,) = cli.ok("--zone", "UTC", "runs", "rig", *HERE, "--json").json["runs"]
    assert (run["electrode"], run["start"], run["subject"]) == ("B9-03", "2026-02-05T08:00:00Z", "animal-1")
    assert run["said"] == [
        "its start is the list's; the file says 2026-02-02 10:00",
        "its subject is the list's; the file says animal-7",
    ]


def test_two_probes_in_one_recording_are_two_runs(cli: Any, folder: Path) -> None:
    write_list(folder, row("a.csv"), row("a.csv", probe="B9-02"))
    cli.ok("runs", "rig", *HERE, "--commit")
    assert len(exposures(cli, "B9-01")) == len(exposures(cli, "B9-02")) == 1


@pytest.mark.parametrize(
    ("cells", "said"),
    [
        ({"probe": "B9-91"}, "the nearest labels are B9-01"),
        ({"probe": ""}, "names no probe"),
        ({"start": ""}, "when did it begin?"),
        ({"start": "soon"}, "recordings.csv line 2, start: 'soon' is not a time"),
        ({"start": "2026-02-02"}, "a day without a time"),
        ({"start": "2199-01-01T00:00Z"}, "in the future"),
        ({"duration_s": "1 h"}, "line 2, duration_s: '1 h' is not a number"),
        ({"duration_s": "0"}, "above 0"),
        ({"setting": "in-vitro"}, "no setting is called 'in-vitro'"),
        ({"waveform": "sine"}, "no waveform is called 'sine'"),
        ({"medium": "beer"}, "no medium is called 'beer'"),
        ({"file": "z.csv"}, "there is no such file"),
        ({"file": "../record.db"}, "lies outside this folder"),
        ({"file": "c.npy"}, "accepted: its rate_hz or its duration_s too"),
        ({"file": "notes.txt"}, "is no kind of recording"),
    ],
)
def test_a_row_that_cannot_be_taken_is_refused_with_what_would_be(
    cli: Any, folder: Path, cells: dict[str, str], said: str
) -> None:
    (folder / "notes.txt").write_text("nothing", encoding="utf-8")
    write_list(folder, row("a.csv", duration_s="", setting="", waveform="", medium="") | cells, row("b.npy", 1))
    told = cli.ok("runs", "rig", *HERE, "--commit", "--json")
    assert sorted(one["state"] for one in told.json["runs"]) == ["new", "refused"]
    assert said in " ".join(text for one in told.json["runs"] for text in one["said"])


@pytest.mark.parametrize(
    ("text", "said"),
    [
        ("file,prob\na.csv,B9-01\n", "no column of recordings.csv is called 'prob'; the nearest known one is 'probe'"),
        ("file,file\na.csv,a.csv\n", "stands there twice"),
        ("probe\nB9-01\n", "has no column 'file'"),
        ("file,probe\na.csv\n", "line 2: found 1 cells"),
        ("file,probe\n,B9-01\n", "line 2: names no file"),
        ("", "is empty"),
        ('file,probe\n"a.csv,B9-01\n', "can't be read"),
    ],
)
def test_a_list_that_cannot_be_read_stops_it_all(cli: Any, folder: Path, text: str, said: str) -> None:
    (folder / "recordings.csv").write_text(text, encoding="utf-8")
    assert said in cli.refused("runs", "rig", *HERE, "--commit")


def test_a_list_larger_than_anybody_would_write_is_not_read(cli: Any, folder: Path) -> None:
    (folder / "recordings.csv").write_bytes(b"file,probe\n" + b"a.csv,B9-01\n" * 1_500_000)
    assert "recordings.csv: is larger than 16 MB; accepted: CSV in UTF-8" in cli.refused("runs", "rig", *HERE)


@pytest.mark.skipif(not hasattr(os, "mkfifo"), reason="this system has no pipes with a name")
def test_a_pipe_in_the_place_of_the_list_is_not_waited_for(cli: Any, folder: Path) -> None:
    os.mkfifo(folder / "recordings.csv")
    assert "recordings.csv: is a folder, a pipe or a device; accepted: a file" in cli.refused("runs", "rig", *HERE)


def test_semicolons_a_byte_order_mark_and_backslashes_are_taken(cli: Any, folder: Path) -> None:
    (folder / "day1").mkdir()
    (folder / "a.csv").rename(folder / "day1" / "a.csv")
    text = "\ufefffile;probe;start\r\nday1\\a.csv;B9-01;2026-02-02T10:00Z\r\n;;\r\n"
    (folder / "recordings.csv").write_text(text, encoding="utf-8", newline="")
    assert states(cli.ok("runs", "rig", *HERE, "--json")) == {"day1/a.csv": "new"}


def test_of_a_large_file_only_the_ends_are_read(tmp_path: Path) -> None:
    path = tmp_path / "large.csv"
    with path.open("w", encoding="utf-8") as file:
        file.write("current_na;time_min\n")
        file.writelines(f"1.5;{k}\n" for k in range(200_000))
        file.write("\n")
    assert span_s(path) == (0.0, 199_999 * 60.0)
    cut = tmp_path / "cut.csv"
    cut.write_text("time_s,current_na\n0,1\n1,1\nx", encoding="utf-8")
    with pytest.raises(InputError, match=r"cut\.csv: its time 'x' is no number"):
        span_s(cut)
    cut.write_text("time_s,current_na\n", encoding="utf-8")
    with pytest.raises(InputError, match="has no row below its names"):
        span_s(cut)
    sheet = tmp_path / "scans.npy"
    np.save(sheet, np.zeros((601, 850)))
    assert span_s(sheet, rate_hz=10.0) == (0.0, 60.0)
