"""From a recording in a file to a logged calibration: found, overridden by hand, kept, refused."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import h5py
import numpy as np
import pytest

from electrolog.answers.handling import MARK
from tests.measure import recordings

FOUR = ("0.25uM", "0.5uM", "1uM", "2uM")
TRUE_NA = [3, 6, 12, 24]


def write(path: Path, text: str) -> str:
    path.write_text(text, encoding="utf-8")
    return str(path)


def csv_of(columns: str, rows: Any) -> str:
    return columns + "\n" + "\n".join(",".join(f"{cell:.6g}" for cell in row) for row in rows) + "\n"


@pytest.fixture(scope="module")
def trace() -> Any:
    return recordings.trace()


@pytest.fixture(scope="module")
def sheet() -> Any:
    return recordings.sheet()


@pytest.fixture
def traced(trace: Any, tmp_path: Path) -> str:
    time, current, _ = trace
    np.save(tmp_path / "run.npy", np.column_stack([time, current]))
    return str(tmp_path / "run.npy")


def save_trace(kind: str, folder: Path, time: Any, current: Any) -> str:
    path = folder / f"run.{kind.partition(' ')[0]}"
    if kind == "csv":
        return write(path, csv_of("time_s,current_na", zip(time, current, strict=True)))
    if kind == "csv in min and pA":
        return write(path, csv_of("current_pA;time_min".replace(";", ","), zip(current * 1e3, time / 60, strict=True)))
    if kind == "csv with semicolons":
        return write(path, csv_of("time_s,current_na", zip(time, current, strict=True)).replace(",", ";"))
    if kind == "npy":
        np.save(path, np.column_stack([time, current]))
    elif kind == "npy with names":
        both = np.rec.fromarrays([time * 1e3, current], names="time_ms,current_na")
        np.save(path, both)
    elif kind == "npy of currents":
        np.save(path, current)
    else:
        with h5py.File(path, "w") as file:
            file["cell/time_s"], file["cell/current_ua"] = time, current / 1e3
    return str(path)


KINDS = ["csv", "csv in min and pA", "csv with semicolons", "npy", "npy with names", "npy of currents", "h5"]


@pytest.mark.parametrize("kind", KINDS)
def test_a_trace_becomes_a_calibration_from_every_kind_of_file(cli: Any, tmp_path: Path, trace: Any, kind: str) -> None:
    file = save_trace(kind, tmp_path, *trace[:2])
    rate = ("--rate", "10") if kind == "npy of currents" else ()
    one = cli.ok("trace", "B9-01", "pre", "DA", file, *FOUR, "-w", "triangle", *rate, "--json").json
    assert [point["concentration_um"] for point in one["points"]] == [0.25, 0.5, 1, 2]
    assert [point["current_na"] for point in one["points"]] == pytest.approx(TRUE_NA, rel=0.015)
    assert one["sensitivity_na_um"] == pytest.approx(12, rel=0.01)
    assert one["lod_um"] == pytest.approx(3 * 0.08 / 12, rel=0.1)
    assert one["handling"]["signal"]["file"] == Path(file).name


def save_sheet(kind: str, folder: Path, scans: Any, potential: Any, time: Any) -> str:
    path = folder / f"run.{kind.partition(' ')[0]}"
    if kind == "npy":
        np.save(path, scans)
    elif kind == "csv":
        head = ",".join(["time_s", *[f"{value:.5f}" for value in potential]])
        write(path, csv_of(head, np.column_stack([time, scans])))
    else:
        with h5py.File(path, "w") as file:
            file["current_na"] = scans.T if "turned" in kind else scans
            file["potential_mv"], file["time_s"] = potential * 1e3, time
    return str(path)


@pytest.mark.parametrize("kind", ["npy", "csv", "h5", "h5 turned"])
def test_a_sheet_becomes_a_calibration_from_every_kind_of_file(cli: Any, tmp_path: Path, sheet: Any, kind: str) -> None:
    file = save_sheet(kind, tmp_path, *sheet[:3])
    one = cli.ok("scans", "B9-01", "pre", "DA", file, *FOUR, "-w", "triangle", "--json").json
    assert [point["current_na"] for point in one["points"]] == pytest.approx(TRUE_NA, abs=0.3)
    (row,) = (event for event in cli.ok("life", "B9-01", "--json").json["events"] if "oxidation_peak_v" in event)
    assert row["oxidation_peak_v"] == pytest.approx(0.62, abs=0.02)
    assert row["reduction_peak_v"] == pytest.approx(-0.18, abs=0.02)
    assert row["background_na"] == pytest.approx(300, abs=5)
    assert row["noise_na"] == pytest.approx(0.8 / 5**0.5, rel=0.2)


def test_a_look_says_what_is_found_and_logs_nothing(cli: Any, traced: str) -> None:
    before = cli.entries()
    said = cli.ok("trace", "B9-01", "pre", "DA", traced, *FOUR, "-w", "triangle", "--look").out
    assert "4 injections; nothing was logged" in said
    assert "60 to 90" in said
    told = cli.ok("trace", "B9-01", "pre", "DA", traced, *FOUR, "--look", "--json").json
    assert [one["level_na"] for one in told["injections"]] == pytest.approx(TRUE_NA, rel=0.015)
    assert cli.entries() == before


def test_every_choice_is_kept_with_the_calibration_and_survives_export(cli: Any, traced: str, tmp_path: Path) -> None:
    chosen = ("--plateau", "0.6-0.9", "--baseline", "1", "--edge", "3", "--leave-out", "2", "--weights", "1/x")
    one = cli.ok(
        "trace", "B9-01", "pre", "DA", traced, *FOUR, "-w", "triangle", *chosen, "--note", "first", "--json"
    ).json
    signal = one["handling"]["signal"]
    assert one["handling"]["weights"] == "1/x"
    assert signal["settings"]["plateau"] == [0.6, 0.9]
    assert signal["settings"]["baseline_degree"] == 1
    assert signal["settings"]["edge_s"] == 3
    assert signal["left_out"] == [2]
    assert len(signal["injections"]) == 4
    assert len(one["points"]) == 3
    assert len(signal["sha256"]) == 64
    assert "note first" in cli.ok("life", "B9-01").out
    assert MARK not in cli.ok("life", "B9-01").out
    cli.ok("export", str(tmp_path / "out"))
    fresh = str(tmp_path / "fresh.db")
    other = type(cli)(fresh, cli.monkeypatch)
    other.ok("setup")
    other.ok("import", str(tmp_path / "out"))
    again = other.ok("calibrations", "B9-01", "--json").json[0]
    assert again["handling"] == one["handling"]
    assert again["sensitivity_na_um"] == one["sensitivity_na_um"]


def test_a_table_of_injections_may_bring_the_concentrations(cli: Any, traced: str, tmp_path: Path, trace: Any) -> None:
    rows = [(start, start + 30, c) for start, c in zip(trace[2], recordings.CONCENTRATIONS, strict=True)]
    table = write(tmp_path / "injections.csv", csv_of("start_s,end_s,concentration_um", rows))
    one = cli.ok("trace", "B9-01", "pre", "DA", traced, "-w", "triangle", "--injections", table, "--json").json
    assert one["sensitivity_na_um"] == pytest.approx(12, rel=0.01)
    assert one["handling"]["signal"]["settings"]["injections_given"]


def test_a_recording_of_the_wrong_sign_is_asked_about(cli: Any, trace: Any, tmp_path: Path) -> None:
    np.save(tmp_path / "run.npy", np.column_stack([trace[0], -trace[1]]))
    args = ("trace", "B9-01", "pre", "DA", str(tmp_path / "run.npy"), *FOUR, "-w", "triangle")
    assert "--negative turns the recording" in cli.refused(*args)
    assert cli.ok(*args, "--negative", "--json").json["sensitivity_na_um"] == pytest.approx(12, rel=0.01)
    kept = cli.ok(*args, "--yes", "--json").json
    assert kept["sensitivity_na_um"] == pytest.approx(-12, rel=0.01)
    assert any("oxidation recorded as negative" in text for text in kept["warnings"])


def test_warnings_of_the_recording_stay_with_the_calibration(cli: Any, trace: Any, tmp_path: Path) -> None:
    time, current, _ = trace
    np.save(tmp_path / "run.npy", np.column_stack([time, np.minimum(current, 20)]))
    cli.ok("trace", "B9-01", "pre", "DA", str(tmp_path / "run.npy"), *FOUR, "-w", "triangle")
    said = cli.ok("calibrations", "B9-01", "--json").json[0]["warnings"]
    assert any("injection 4" in text and "amplifier was at its limit" in text for text in said)


def test_potentials_that_nothing_says_are_asked_for(cli: Any, sheet: Any, tmp_path: Path) -> None:
    file = save_sheet("npy", tmp_path, *sheet[:3])
    assert "name the waveform" in cli.refused("scans", "B9-01", "pre", "DA", file, *FOUR)


def test_potentials_unlike_the_waveforms_are_asked_about(cli: Any, sheet: Any, tmp_path: Path) -> None:
    file = save_sheet("h5", tmp_path, *sheet[:3])
    common = ("scans", "B9-01", "pre", "DA", file, *FOUR, "-w", "serotonin-n")
    assert "is it the right waveform?" in cli.refused(*common)
    assert "from -0.4 to 1.3 V" in " ".join(cli.ok(*common, "--look").out.split())


@pytest.mark.parametrize(
    ("name", "content", "words"),
    [
        ("run.csv", "", "first row is empty"),
        ("run.csv", "time_s,volts\n1,2\n2,3\n", "has no current"),
        ("run.csv", "time_s,current_na,current_pa\n1,2,3\n", "current_na and current_pa"),
        ("run.csv", "time_s,current_na\n0,1\n1,abc\n", "line 3, column 2: 'abc' is not a number"),
        ("run.csv", "time_s,current_na\n0,1\n1,2\n", "2 samples are no recording"),
        ("run.csv", "time_s,current_na\n0,1\n1,2,3\n", "run.csv"),
        ("run.npy", "no numpy", "run.npy: can't be read"),
        ("run.h5", "no hdf5", "run.h5: is no HDF5 file"),
        ("run.txt", "time_s,current_na\n", "'.txt' is no kind of recording"),
    ],
)
def test_a_file_that_is_no_trace_is_refused_by_name(
    cli: Any, tmp_path: Path, name: str, content: str, words: str
) -> None:
    file = write(tmp_path / name, content)
    assert words in cli.refused("trace", "B9-01", "pre", "DA", file, *FOUR, "-w", "triangle")


def test_a_file_that_was_overwritten_is_refused_in_words(cli: Any, tmp_path: Path) -> None:
    """What NumPy's header and HDF5's inner marks make of it are errors of kinds that no reader would expect."""
    np.save(tmp_path / "a.npy", np.zeros((400, 2)))
    header = (tmp_path / "a.npy").read_bytes()
    (tmp_path / "a.npy").write_bytes(header.replace(b"(400, 2)", b"((((400,"))
    with h5py.File(tmp_path / "a.h5", "w") as file:
        file["time_s"], file["current_na"] = np.arange(400.0), np.zeros(400)
    marks = (tmp_path / "a.h5").read_bytes()
    (tmp_path / "a.h5").write_bytes(marks.replace(b"HEAP", b"HEAR").replace(b"SNOD", b"SNOW"))
    for name in ("a.npy", "a.h5"):
        assert f"{name}: " in cli.refused("trace", "B9-01", "pre", "DA", str(tmp_path / name), *FOUR, "-w", "triangle")


def test_a_file_that_would_unpack_to_more_than_there_is_memory_is_refused(cli: Any, tmp_path: Path) -> None:
    with h5py.File(tmp_path / "bomb.h5", "w") as file:
        file.create_dataset("current_na", (10**12,), "f8", chunks=(10**5,), compression="gzip")
        file["time_s"] = np.arange(5.0)
    said = cli.refused("trace", "B9-01", "pre", "DA", str(tmp_path / "bomb.h5"), *FOUR, "-w", "triangle")
    assert "unpack to 8e+03 GB" in said


def test_a_missing_file_and_foreign_arrays_are_refused(cli: Any, tmp_path: Path) -> None:
    common = ("B9-01", "pre", "DA")
    assert "there is no such file" in cli.refused("trace", *common, "nowhere.csv", *FOUR)
    np.save(tmp_path / "words.npy", np.array(["a", "b"]))
    assert "which are no numbers" in cli.refused("trace", *common, str(tmp_path / "words.npy"), *FOUR)
    np.save(tmp_path / "objects.npy", np.array([{}]), allow_pickle=True)
    assert "can't be read" in cli.refused("trace", *common, str(tmp_path / "objects.npy"), *FOUR)
    np.save(tmp_path / "cube.npy", np.zeros((3, 4, 5)))
    assert "(3, 4, 5)" in cli.refused("scans", *common, str(tmp_path / "cube.npy"), *FOUR, "-w", "triangle")
    np.save(tmp_path / "currents.npy", np.arange(50.0))
    assert "--rate 10" in cli.refused("trace", *common, str(tmp_path / "currents.npy"), *FOUR)


@pytest.mark.parametrize(
    ("options", "words"),
    [
        ((), "concentrations: missing"),
        (("1uM", "2uM"), "4 injections stand in the recording and 2 concentrations"),
        (("-1uM", "0.5uM", "1uM", "2uM"), ""),
        ((*FOUR, "--plateau", "half"), "'half' is no stretch"),
        ((*FOUR, "--leave-out", "7"), "there is no injection 7"),
        ((*FOUR, "--weights", "heavy"), "weights: 'heavy' is no scheme"),
        ((*FOUR, "--weights", "replicates"), "can't give a weight"),
        ((*FOUR, "--figure", "run.bmp"), "no ending of a picture"),
        ((*FOUR, "--edge", "0"), "edge: 0 s is no length"),
    ],
)
def test_what_cant_be_meant_is_refused_and_nothing_written(
    cli: Any, traced: str, options: tuple[str, ...], words: str
) -> None:
    status = 1 if "replicates" in options else 2
    assert words in cli.refused("trace", "B9-01", "pre", "DA", traced, "-w", "triangle", *options, status=status)


@pytest.mark.parametrize("ending", ["png", "svg", "pdf"])
def test_a_picture_is_drawn_of_what_was_found(cli: Any, traced: str, sheet: Any, tmp_path: Path, ending: str) -> None:
    heads = {"png": b"\x89PNG", "svg": b"<?xml", "pdf": b"%PDF"}
    picture = tmp_path / f"trace.{ending}"
    common = ("B9-01", "pre", "DA")
    cli.ok("trace", *common, traced, *FOUR, "-w", "triangle", "--look", "--figure", str(picture))
    assert picture.read_bytes().startswith(heads[ending])
    file = save_sheet("npy", tmp_path, *sheet[:3])
    picture = tmp_path / f"scans.{ending}"
    cli.ok("scans", *common, file, *FOUR, "-w", "triangle", "--look", "--figure", str(picture))
    assert picture.stat().st_size > 10_000
