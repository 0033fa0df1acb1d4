"""A folder of NWB recordings becomes exposures: nobody types start, duration and subject, and nothing is guessed."""

from __future__ import annotations

import os
import shutil
import sys
from datetime import UTC, datetime, timedelta
from pathlib import Path
from typing import Any

import numpy as np
import pytest

from electrolog.lab import open_lab
from tests.cli.recordings import BEGAN, patched, set_start, sha256, write_nwb

HERE = ("--setting", "in-vivo")


@pytest.fixture
def folder(tmp_path: Path) -> Path:
    """Two runs of one probe on two days."""
    write_nwb(tmp_path / "rig" / "B9-01_R1.nwb")
    write_nwb(tmp_path / "rig" / "B9-01_R2.nwb", began=BEGAN + timedelta(days=1), subject="animal-8")
    return tmp_path / "rig"


def states(answer: Any) -> dict[str, str]:
    return {run["file"]: run["state"] for run in answer.json["runs"]}


def said_of(answer: Any, file: str) -> str:
    return " ".join(text for run in answer.json["runs"] if run["file"] == file for text in run["said"])


def exposures(cli: Any, probe: str = "B9-01") -> list[dict[str, Any]]:
    return [row for row in open_lab(cli.db).rows("exposures") if row["electrode"] == probe]


def test_a_dry_run_lists_what_would_be_logged_and_writes_nothing(cli: Any, folder: Path) -> None:
    before = cli.entries()
    out = cli.ok("runs", "rig", *HERE).out
    assert "2 new" in out
    assert "animal-8" in out
    assert "2 h" in out
    assert "nothing was written" in out
    assert cli.entries() == before


def test_a_commit_logs_start_length_and_subject_with_their_origin(cli: Any, folder: Path) -> None:
    assert states(cli.ok("runs", "rig", *HERE, "-w", "triangle", "--commit", "--json")) == {
        "B9-01_R1.nwb": "new",
        "B9-01_R2.nwb": "new",
    }
    first, second = exposures(cli)
    assert (first["start"], first["duration_min"], first["subject"]) == (BEGAN, 120.0, "animal-7")
    assert (first["setting"], first["waveform"], first["recording"]) == ("in-vivo", "triangle", "B9-01_R1")
    assert second["start"] == BEGAN + timedelta(days=1)
    digest = sha256(folder / "B9-01_R1.nwb")
    assert first["note"] == f"from B9-01_R1.nwb ({digest[:12]})"
    reasons = [entry.reason for entry in open_lab(cli.db).journal("exposures", first["id"])]
    assert reasons == [f"read from B9-01_R1.nwb, SHA-256 {digest}"]
    assert "exposed 4 h in-vivo" in cli.ok("life", "B9-01").out
    cli.ok("verify")


def test_the_same_folder_again_adds_only_what_is_new(cli: Any, folder: Path) -> None:
    cli.ok("runs", "rig", *HERE, "--commit")
    before = cli.entries()
    assert set(states(cli.ok("runs", "rig", *HERE, "--commit", "--json")).values()) == {"there already"}
    assert cli.entries() == before
    write_nwb(folder / "B9-02_R3.nwb", began=BEGAN + timedelta(days=2))
    assert states(cli.ok("runs", "rig", *HERE, "--commit", "--json"))["B9-02_R3.nwb"] == "new"
    assert cli.entries() == before + 1


def test_what_was_corrected_or_struck_since_is_left_as_it_is(cli: Any, folder: Path) -> None:
    cli.ok("runs", "rig", *HERE, "--commit")
    first, second = (str(row["id"]) for row in exposures(cli))
    cli.ok("amend", "exposure", first, "duration_min=3h", "start=2026-02-02T06:00Z", "--why", "clock was wrong")
    cli.ok("strike", "exposure", second, "--why", "another probe")
    before = cli.entries()
    told = cli.ok("runs", "rig", *HERE, "--commit", "--json")
    assert set(states(told).values()) == {"there already"}
    assert "read from this very file" in said_of(told, "B9-01_R2.nwb")
    assert cli.entries() == before


def test_a_run_that_was_typed_already_isnt_logged_twice(cli: Any, folder: Path) -> None:
    typed = ("--for", "2h10min", "-s", "in-vivo", "--start", "2026-02-02T09:55Z")
    cli.ok("expose", "B9-01", *typed, "--recording", "B9-01_R1")
    assert states(cli.ok("runs", "rig", *HERE, "--json"))["B9-01_R1.nwb"] == "there already"
    (row,) = exposures(cli)
    cli.ok("amend", "exposure", str(row["id"]), "recording=", "--why", "not noted")
    told = cli.ok("runs", "rig", *HERE, "--json")
    assert states(told)["B9-01_R1.nwb"] == "refused"
    assert f"electrolog amend exposure {row['id']} recording=B9-01_R1" in said_of(told, "B9-01_R1.nwb")


def test_a_run_typed_at_the_same_moment_gets_what_was_not_known(cli: Any, folder: Path) -> None:
    cli.ok("expose", "B9-01", "--for", "2h", "-s", "in-vivo", "--start", BEGAN.isoformat())
    assert states(cli.ok("runs", "rig", *HERE, "--commit", "--json"))["B9-01_R1.nwb"] == "filled in"
    assert exposures(cli)[0]["subject"] == "animal-7"


def test_where_the_probe_was_is_asked_and_never_guessed(cli: Any, folder: Path) -> None:
    out = " ".join(cli.ok("runs", "rig").out.split())
    assert "waits for an answer" in out
    assert "? setting: where was the probe in 2 recordings?" in out
    assert "accepted: in-vivo, slice" in out
    assert "where was the probe" in cli.refused("runs", "rig", "--commit")
    assert "no setting is called 'in-vitro'" in cli.refused("runs", "rig", "--setting", "in-vitro")


def test_a_person_is_asked_where_the_probe_was(cli: Any, folder: Path) -> None:
    pty = pytest.importorskip("pty", reason="a terminal of its own needs a POSIX system")
    command = [sys.executable, "-m", "electrolog", "--db", cli.db, "runs", "rig", "--commit"]
    said = b""

    def read(descriptor: int) -> bytes:
        nonlocal said
        piece = os.read(descriptor, 4096)
        said += piece
        if piece.rstrip().endswith(b"setting:"):
            os.write(descriptor, b"slice\n")
        return piece

    assert pty.spawn(command, read, lambda _: b"") == 0
    assert b"where was the probe in 2 recordings?" in said
    assert {row["setting"] for row in exposures(cli)} == {"slice"}


# --- which probe ------------------------------------------------------------------------------------------


def probe_of(cli: Any, *options: str) -> tuple[str, str]:
    (run,) = cli.ok("runs", "rig", *HERE, *options, "--json").json["runs"]
    return run["electrode"] or run["state"], run["electrode_from"] or " ".join(run["said"])


def test_the_probe_is_read_from_a_device_before_the_name(cli: Any, tmp_path: Path) -> None:
    write_nwb(tmp_path / "rig" / "B9-02.nwb", serial="B9-03")
    assert probe_of(cli) == ("B9-03", "a device in the file")


@pytest.mark.parametrize(
    ("file", "probe"),
    [
        ("2026-02-02_B9-01_R1.nwb", "B9-01"),
        ("b9-01 run 1.nwb", "B9-01"),
        ("B07-02/run1.nwb", "B07-02"),
        ("B9-02/day 1/run1.nwb", "B9-02"),
        ("B9-03/B9-03 run1.nwb", "B9-03"),
    ],
)
def test_the_probe_is_read_from_the_files_name_or_its_folders(cli: Any, tmp_path: Path, file: str, probe: str) -> None:
    write_nwb(tmp_path / "rig" / file)
    assert probe_of(cli)[0] == probe


@pytest.mark.parametrize(
    ("file", "said"),
    [
        ("R1.nwb", "names no probe, nor does its file or folder"),
        ("B9-1.nwb", "the nearest labels are B9-01"),
        ("XB9-01.nwb", "the nearest labels are B9-01"),
        ("R0121_B902.nwb", "the nearest labels are B9-02"),
        ("B9-011.nwb", "names no probe"),
        ("B9-01_B9-02.nwb", "name 2 probes: B9-01, B9-02"),
        ("B9-01/B9-02.nwb", "name 2 probes: B9-02, B9-01"),
    ],
)
def test_a_likeness_is_no_name(cli: Any, tmp_path: Path, file: str, said: str) -> None:
    write_nwb(tmp_path / "rig" / file)
    state, why = probe_of(cli)
    assert state == "refused"
    assert said in why


def test_a_label_of_digits_isnt_found_in_a_date(cli: Any, tmp_path: Path) -> None:
    cli.ok("new", "02")
    write_nwb(tmp_path / "rig" / "2026-02-02.nwb")
    assert probe_of(cli)[0] == "refused"
    assert probe_of(cli, "--probe", "02") == ("02", "--probe")


def test_the_probe_may_be_typed_of_one_file_or_of_all(cli: Any, tmp_path: Path) -> None:
    write_nwb(tmp_path / "rig" / "run1.nwb")
    assert probe_of(cli, "--probe", "run1.nwb=b9-02") == ("B9-02", "--probe")
    assert probe_of(cli, "--probe", "B9-03") == ("B9-03", "--probe")
    assert "no probe is called 'B99'" in cli.refused("runs", "rig", *HERE, "--probe", "B99")
    cli.ok("runs", "rig", *HERE, "--probe", "B9-03", "--commit")
    assert probe_of(cli) == ("there already", "exposure 13 was read from this very file")
    (tmp_path / "rig" / "run1.nwb").rename(tmp_path / "rig" / "B9-01.nwb")
    assert "its name says B9-01, --probe says B9-03" in probe_of(cli, "--probe", "B9-03")[1]


# --- what can be wrong ------------------------------------------------------------------------------------


def cut(path: Path) -> None:
    path.write_bytes(path.read_bytes()[:60_000])


def emptied(path: Path) -> None:
    path.write_bytes(b"")


def text(path: Path) -> None:
    path.write_text("not a recording at all\n" * 100, encoding="utf-8")


def other_hdf5(path: Path) -> None:
    path.unlink()
    with patched(path) as file:
        file["x"] = np.arange(3)


def without_start(path: Path) -> None:
    with patched(path) as file:
        del file["session_start_time"], file["timestamps_reference_time"]


def as_folder(path: Path) -> None:
    path.unlink()
    path.mkdir()


def without_series(path: Path) -> None:
    with patched(path) as file:
        del file["acquisition/current"]


def one_sample(path: Path) -> None:
    write_nwb(path, data=np.array([1e-9]))


def in_the_future(path: Path) -> None:
    write_nwb(path, began=datetime(2199, 1, 1, tzinfo=UTC))


@pytest.mark.parametrize(
    ("spoil", "said"),
    [
        (cut, "is cut short (60000 bytes)"),
        (emptied, "is no HDF5 file"),
        (text, "is no HDF5 file"),
        (other_hdf5, "nothing in it is NWB"),
        (without_start, "says no start time"),
        (lambda path: set_start(path, "2026-02-02"), "is a day without a time"),
        (lambda path: set_start(path, "last Tuesday"), "'last Tuesday' is not a time"),
        (lambda path: set_start(path, "1904-01-01T00:00:00+00:00"), "the year 1904"),
        (as_folder, "is a folder"),
        (without_series, "time series acquired: none"),
        (one_sample, "has no length"),
        (in_the_future, "in the future: is its clock right?"),
    ],
)
def test_what_cannot_be_read_is_refused_and_the_rest_is_taken(cli: Any, folder: Path, spoil: Any, said: str) -> None:
    spoil(folder / "B9-01_R1.nwb")
    told = cli.ok("runs", "rig", *HERE, "--commit", "--json")
    assert states(told) == {"B9-01_R1.nwb": "refused", "B9-01_R2.nwb": "new"}
    assert said in said_of(told, "B9-01_R1.nwb")
    assert said in " ".join(cli.ok("runs", "rig", *HERE).out.split())
    assert len(exposures(cli)) == 1


@pytest.mark.parametrize("seed", range(8))
def test_damaged_bytes_are_a_refusal_and_no_error_of_our_own(cli: Any, folder: Path, seed: int) -> None:
    rng = np.random.default_rng(seed)
    path = folder / "B9-01_R1.nwb"
    content = bytearray(path.read_bytes())
    for place in rng.integers(0, len(content), 40).tolist():
        content[place] = int(rng.integers(0, 256))
    path.write_bytes(content)
    answer = cli("runs", "rig", *HERE)
    assert (answer.status, answer.err) == (0, "")
    assert "B9-01_R1.nwb" in answer.out


def test_a_start_without_an_offset_is_read_in_the_zone_and_said(cli: Any, folder: Path) -> None:
    set_start(folder / "B9-01_R1.nwb", "2026-02-02T10:00:00")
    set_start(folder / "B9-01_R2.nwb", "2026-10-25T01:30:00")
    told = cli.ok("--zone", "Europe/Lisbon", "runs", "rig", *HERE, "--json")
    assert told.json["runs"][0]["start"] == "2026-02-02T10:00:00Z"
    assert "no offset: taken for the time of Europe/Lisbon, 2026-02-02 10:00" in said_of(told, "B9-01_R1.nwb")
    assert "the hour in which the clocks change" in said_of(told, "B9-01_R2.nwb")
    cayenne = cli.ok("--zone", "America/Cayenne", "runs", "rig", *HERE, "--json").json["runs"][0]
    assert cayenne["start"] == "2026-02-02T13:00:00Z"


def test_a_missing_subject_is_said_and_stays_unknown(cli: Any, folder: Path) -> None:
    write_nwb(folder / "B9-01_R1.nwb", subject=None)
    told = cli.ok("runs", "rig", *HERE, "--commit", "--json")
    assert "names no subject" in said_of(told, "B9-01_R1.nwb")
    assert exposures(cli)[0]["subject"] is None


def test_the_first_sample_is_the_start_wherever_time_zero_lies(cli: Any, folder: Path) -> None:
    write_nwb(folder / "B9-01_R1.nwb", data=np.ones(100) * 1e-9, timestamps=600.0 + np.arange(100.0) * 10)
    cli.ok("runs", "rig", *HERE, "--commit")
    assert exposures(cli)[0]["start"] == BEGAN + timedelta(minutes=10)
    assert exposures(cli)[0]["duration_min"] == pytest.approx(16.5)


def test_the_same_run_twice_is_taken_once_and_two_at_a_time_not_at_all(cli: Any, folder: Path) -> None:
    shutil.copy(folder / "B9-01_R1.nwb", folder / "copy of B9-01_R1.nwb")
    write_nwb(folder / "B9-01_R4.nwb", began=BEGAN + timedelta(days=1, hours=1))
    told = cli.ok("runs", "rig", *HERE, "--commit", "--json")
    assert states(told) == {
        "B9-01_R1.nwb": "new",
        "B9-01_R2.nwb": "refused",
        "B9-01_R4.nwb": "refused",
        "copy of B9-01_R1.nwb": "repeated",
    }
    assert "overlaps with B9-01_R4.nwb" in said_of(told, "B9-01_R2.nwb")
    assert "the same run as B9-01_R1.nwb" in said_of(told, "copy of B9-01_R1.nwb")
    assert len(exposures(cli)) == 1


def test_a_run_on_record_stays_there_whatever_else_comes(cli: Any, folder: Path) -> None:
    cli.ok("runs", "rig", *HERE, "--commit")
    write_nwb(folder / "B9-01_R4.nwb", began=BEGAN + timedelta(days=1, hours=1))
    told = cli.ok("runs", "rig", *HERE, "--commit", "--json")
    assert states(told) == dict.fromkeys(("B9-01_R1.nwb", "B9-01_R2.nwb"), "there already") | {
        "B9-01_R4.nwb": "refused"
    }


def test_what_is_doubtful_is_logged_only_when_somebody_says_yes(cli: Any, tmp_path: Path) -> None:
    write_nwb(tmp_path / "rig" / "B07-02 run.nwb")  # broken on 21 January
    write_nwb(tmp_path / "rig" / "B9-01 run.nwb", began=datetime(2025, 12, 1, tzinfo=UTC))
    write_nwb(tmp_path / "rig" / "B9-02 run.nwb", length_s=30 * 3600)
    told = cli.ok("runs", "rig", *HERE, "--commit", "--json")
    assert set(states(told).values()) == {"doubtful"}
    assert "was retired on" in said_of(told, "B07-02 run.nwb")
    assert "before the probe was made" in said_of(told, "B9-01 run.nwb")
    assert "is a long run" in said_of(told, "B9-02 run.nwb")
    assert exposures(cli) == []
    assert set(states(cli.ok("runs", "rig", *HERE, "--commit", "--yes", "--json")).values()) == {"new"}
    assert len(exposures(cli)) == 1


def test_a_folder_that_isnt_one_is_refused(cli: Any, tmp_path: Path) -> None:
    assert "is not there" in cli.refused("runs", "nowhere", *HERE)
    (tmp_path / "a.nwb").write_bytes(b"")
    assert "is a file" in cli.refused("runs", "a.nwb", *HERE)
    (tmp_path / "bare").mkdir()
    assert "no recording" in cli.ok("runs", "bare", *HERE).out


def test_python_does_the_same(cli: Any, folder: Path) -> None:
    lab = open_lab(cli.db)
    assert lab.read_runs(folder, setting="in-vivo").count("new") == 2
    assert lab.read_runs(folder, setting="in-vivo", commit=True).committed
    assert len(exposures(cli)) == 2
