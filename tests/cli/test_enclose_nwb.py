"""A probe's papers in an NWB file: read back by pynwb, passed by the format's own inspector, the recording unharmed."""

from __future__ import annotations

import contextlib
import csv
import json
import shutil
import subprocess
import sys
import time
from datetime import timedelta
from pathlib import Path
from typing import Any

import h5py
import numpy as np
import pytest
from nwbinspector import Importance, inspect_nwbfile
from pynwb import NWBHDF5IO, TimeSeries, validate
from pynwb.base import ProcessingModule

from electrolog.lab import open_lab
from tests.cli import fouled_lab
from tests.cli.recordings import BEGAN, datasets, patched, sha256, write_nwb

RUN = fouled_lab.FIRST + fouled_lab.DAYS * fouled_lab.BETWEEN_DAYS + timedelta(hours=2)
TIME_S = np.arange(0.0, 4 * 3600, 2.0)
TRUTH_UM = 0.5
CURRENT_NA = TRUTH_UM * np.exp(fouled_lab.LEVEL - fouled_lab.RATE * TIME_S / 3600)
ASKED = ("-a", "dopamine", "-p", "R1")
OURS = ("processing/electrolog_R1", "general/devices/microelectrode_R1")


@pytest.fixture
def recording(tmp_path: Path) -> Path:
    """Of probe R1's run: half a micromolar all the while, at a sensitivity that falls by a law that is known."""
    data = (CURRENT_NA * 1e-9).astype(np.float32)
    return write_nwb(tmp_path / "rec-R1.nwb", began=RUN, data=data, rate_hz=0.5)


def tables(path: Path, module: str = "electrolog_R1") -> dict[str, list[dict[str, Any]]]:
    with NWBHDF5IO(str(path), "r") as io:
        found = io.read().processing[module].data_interfaces
        frames = {name: one.to_dataframe() for name, one in found.items() if hasattr(one, "to_dataframe")}
        return {name: frame.to_dict("records") for name, frame in frames.items()}


def series(path: Path, name: str) -> tuple[np.ndarray, str, np.ndarray]:
    """Values, unit, times."""
    with NWBHDF5IO(str(path), "r") as io:
        one = io.read().processing["electrolog_R1"][name]
        return np.asarray(one.data[:]), one.unit, np.asarray(one.get_timestamps())


def assert_holds_all_of(path: Path, source: Path) -> None:
    """Byte by byte, but for what is ours and what the format's own library says of its newest specification."""
    before, after = datasets(source), datasets(path)
    assert before.keys() <= after.keys()
    assert {name: value for name, value in before.items() if after[name] != value} == {}
    added = {name for name in after.keys() - before.keys() if not name.startswith("specifications/")}
    assert {name for name in added if not name.startswith(OURS)} <= {"processing", "general/devices"}


# --- what is put in ---------------------------------------------------------------------------------------


def test_the_papers_say_what_the_record_says(judged: Any, recording: Path) -> None:
    before = sha256(recording)
    out = judged.ok("enclose", "rec-R1.nwb", *ASKED).out
    assert "the papers of R1 are in rec-R1.enclosed.nwb; rec-R1.nwb itself is untouched" in out
    assert sha256(recording) == before
    found = tables(recording.with_name("rec-R1.enclosed.nwb"))
    told = judged.ok("calibrations", "R1", "--json").json
    for row, one in zip(found["calibrations"], told, strict=True):
        assert (row["calibration"], row["stage"], row["analyte"]) == (one["calibration"], one["stage"], one["analyte"])
        for name in ("sensitivity_na_um", "sensitivity_se_na_um", "intercept_na", "r_squared", "lod_um", "n_points"):
            assert row[name] == pytest.approx(one[name], rel=1e-12)
    points = [(row["concentration_um"], row["current_na"]) for row in found["calibration_points"]]
    assert points == [point for one in open_lab(judged.db).readings(["R1"]) for point in one.points]
    (origin,) = found["origin"]
    assert (origin["recording"], origin["recording_sha256"]) == ("rec-R1.nwb", before)
    assert origin["journal_entries"] == judged.entries()


def test_the_factor_in_force_has_its_interval_and_its_validity(judged: Any, recording: Path) -> None:
    judged.ok("enclose", "rec-R1.nwb", *ASKED)
    (factor,) = tables(recording.with_name("rec-R1.enclosed.nwb"))["factor"]
    first = open_lab(judged.db).readings(["R1"])[0]
    assert factor["calibration"] == first.calibration == "R1/0"
    assert factor["sensitivity_na_um"] == first.figures.sensitivity_na_um
    assert (factor["low_na_um"], factor["high_na_um"]) == (
        first.figures.sensitivity_low_na_um,
        first.figures.sensitivity_high_na_um,
    )
    assert factor["low_na_um"] < factor["sensitivity_na_um"] < factor["high_na_um"]
    assert factor["in_force"] == "yes"
    assert factor["age_h"] == pytest.approx(2.0, abs=0.001)
    assert factor["oldest_allowed_h"] == 2400.0
    assert factor["valid_until"] == (first.at + timedelta(hours=2400)).strftime("%Y-%m-%dT%H:%M:%SZ")


def test_a_factor_that_something_has_voided_says_so(judged: Any, recording: Path) -> None:
    judged.ok("clean", "R1", "-m", "isopropanol", "--at", (RUN - timedelta(minutes=30)).isoformat())
    out = judged.ok("enclose", "rec-R1.nwb", *ASKED).out
    assert "! not in force: since then cleaning with isopropanol" in out
    (factor,) = tables(recording.with_name("rec-R1.enclosed.nwb"))["factor"]
    assert (factor["in_force"], factor["void_because"]) == ("no", "cleaning with isopropanol")
    assert factor["valid_until"] == ""


def test_the_verdict_is_that_of_check_just_before_the_run(judged: Any, recording: Path) -> None:
    asked = ("-a", "dopamine", "-w", "triangle", "-s", "in-vivo", "--run", "4h")
    judged.ok("enclose", "rec-R1.nwb", *ASKED)
    moment = RUN - timedelta(seconds=1)
    told = judged("check", "R1", *asked, "--at", moment.isoformat(), "--json").json[0]
    found = tables(recording.with_name("rec-R1.enclosed.nwb"))
    (verdict,) = found["verdict"]
    assert verdict["verdict"] == told["verdict"] == "fit"
    assert verdict["p_breach"] == pytest.approx(told["p_breach"])
    assert verdict["longest_run_min"] == pytest.approx(told["longest_run_min"])
    assert verdict["sensitivity_na_um_end_median"] == pytest.approx(told["sensitivity_na_um"]["end"]["0.5"])
    assert verdict["fraction_left_end_low"] == pytest.approx(told["fraction_left"]["end"]["0.05"])
    assert [{"rule": row["rule"], "text": row["text"]} for row in found["reasons"]] == told["reasons"]
    assert (verdict["setting"], verdict["run_min"]) == ("in-vivo", 240.0)


def test_every_column_says_its_meaning_and_its_unit(judged: Any, recording: Path) -> None:
    judged.ok("enclose", "rec-R1.nwb", *ASKED, "--convert")
    units = {"_na_um": "nA/µM", "_na": "nA", "_um": "µ", "_h": "in h", "_min": "in min", "_v": "in V", "_c": "in °C"}
    with NWBHDF5IO(str(recording.with_name("rec-R1.enclosed.nwb")), "r") as io:
        module = io.read().processing["electrolog_R1"]
        columns = [column for one in module.data_interfaces.values() for column in getattr(one, "columns", ())]
        assert len(columns) > 60
        for column in columns:
            assert len(column.description) > 2
            ending = next((end for end in units if column.name.endswith(end)), None)
            if ending is not None and column.data.dtype.kind == "f":
                assert units[ending] in column.description, column.name


def test_a_device_stands_for_the_probe(cli: Any, tmp_path: Path) -> None:
    path = write_nwb(tmp_path / "B07-01.nwb")
    cli.ok("enclose", "B07-01.nwb", "-a", "DA")
    with NWBHDF5IO(str(path.with_name("B07-01.enclosed.nwb")), "r") as io:
        device = io.read().devices["microelectrode_B07-01"]
        assert device.serial_number == "B07-01"
        assert device.description.startswith("Carbon-fibre microelectrode B07-01, batch B07, coated: PFSA 2026-01-06")


@pytest.mark.parametrize("times", [{}, {"timestamps": TIME_S}])
def test_the_formats_own_inspector_has_no_critical_message(judged: Any, recording: Path, times: dict[str, Any]) -> None:
    write_nwb(recording, began=RUN, data=CURRENT_NA.astype(np.float32), unit="nanoamperes", rate_hz=0.5, **times)
    judged.ok("enclose", "rec-R1.nwb", *ASKED, "--convert")
    path = recording.with_name("rec-R1.enclosed.nwb")
    assert validate(path=str(path)) == []
    grave = (Importance.CRITICAL, Importance.ERROR, Importance.PYNWB_VALIDATION)
    messages = list(inspect_nwbfile(nwbfile_path=str(path)))
    assert [one.message for one in messages if one.importance in grave] == []
    before = {one.check_function_name for one in inspect_nwbfile(nwbfile_path=str(recording))}
    ours = [one for one in messages if one.importance is Importance.BEST_PRACTICE_VIOLATION]
    assert {one.check_function_name for one in ours} - before == set()


# --- the recording is unharmed ----------------------------------------------------------------------------


@pytest.mark.parametrize(
    "made",
    [
        {"data": CURRENT_NA * 1e-9},
        {"data": CURRENT_NA * 1e-9, "timestamps": TIME_S},
        {"data": (CURRENT_NA * 100).astype(np.int16), "conversion": 1e-11, "offset": 2e-12},
    ],
)
def test_all_that_pynwb_wrote_is_the_same_byte_by_byte(judged: Any, recording: Path, made: dict[str, Any]) -> None:
    write_nwb(recording, began=RUN, serial="R1", **({"rate_hz": 0.5} | made))
    before = sha256(recording)
    judged.ok("enclose", "rec-R1.nwb", *ASKED, "--convert")
    assert sha256(recording) == before
    assert_holds_all_of(recording.with_name("rec-R1.enclosed.nwb"), recording)
    kept = shutil.copy(recording, recording.with_name("kept.nwb"))
    judged.ok("enclose", "rec-R1.nwb", *ASKED, "--convert", "--in-place")
    assert sha256(recording) != before
    assert_holds_all_of(recording, Path(kept))
    assert sorted(path.name for path in recording.parent.iterdir() if path.name.startswith(".")) == []


def test_compressed_data_tables_references_and_links_are_the_same(judged: Any, recording: Path) -> None:
    with NWBHDF5IO(str(recording), "a") as io:
        file = io.read()
        file.add_epoch(0.0, 60.0, ["x"], file.acquisition["current"])  # holds references into the file
        own = ProcessingModule(name="behavior", description="of the lab's own")
        file.add_processing_module(own)
        own.add(TimeSeries(name="linked", data=file.acquisition["current"], unit="amperes", rate=0.5))
        io.write(file)
    with patched(recording) as file:
        place = file["acquisition"].create_group("raw")
        place.create_dataset("x", data=np.arange(10_000), chunks=(100,), compression="gzip")
        place["soft"] = h5py.SoftLink("/acquisition/current/data")
    judged.ok("enclose", "rec-R1.nwb", *ASKED, "--convert")
    assert_holds_all_of(recording.with_name("rec-R1.enclosed.nwb"), recording)


def test_an_older_file_is_taken_and_its_new_version_said(judged: Any, recording: Path) -> None:
    """pynwb 4 raised a file that pynwb 2.5 had made from 2.6.0 to its own version, and changed nothing else."""
    with patched(recording) as file:
        file.attrs["nwb_version"] = "2.6.0"
    assert "the file was of NWB 2.6.0, and is of NWB 2." in judged.ok("enclose", "rec-R1.nwb", *ASKED).out
    assert_holds_all_of(recording.with_name("rec-R1.enclosed.nwb"), recording)


def test_papers_are_put_in_once_and_again_replaces_only_our_own(judged: Any, recording: Path) -> None:
    judged.ok("enclose", "rec-R1.nwb", *ASKED, "--convert")
    path = recording.with_name("rec-R1.enclosed.nwb")
    with NWBHDF5IO(str(path), "a") as io:  # somebody goes on working with the copy
        file = io.read()
        own = ProcessingModule(name="behavior", description="of the lab's own")
        file.add_processing_module(own)
        current = file.processing["electrolog_R1"]["concentration_current"]
        own.add(TimeSeries(name="smoothed", data=np.ones(len(TIME_S)), unit="micromolar", timestamps=TIME_S))
        own.add(TimeSeries(name="linked", data=current, unit="micromolar", rate=0.5))
        io.write(file)
    before = datasets(path)
    assert "the papers of R1 are in it already -- --again" in judged.refused("enclose", "rec-R1.nwb", *ASKED)
    judged.ok("clean", "R1", "-m", "isopropanol", "--at", (RUN - timedelta(minutes=30)).isoformat())
    judged.ok("enclose", "rec-R1.nwb", *ASKED, "--convert", "--again")
    after = datasets(path)
    others = [name for name in before if not name.startswith(OURS)]
    assert {name for name in others if after[name] != before[name]} == set()
    assert tables(path)["factor"][0]["in_force"] == "no"
    with NWBHDF5IO(str(path), "r") as io:
        assert len(io.read().processing["behavior"]["linked"].data) == len(TIME_S)


def test_a_second_probes_papers_stand_beside_the_first(judged: Any, recording: Path) -> None:
    judged.ok("enclose", "rec-R1.nwb", *ASKED)
    judged.ok("enclose", "rec-R1.nwb", "-a", "dopamine", "-p", "R2")
    path = recording.with_name("rec-R1.enclosed.nwb")
    assert tables(path)["electrode"][0]["electrode"] == "R1"
    assert tables(path, "electrolog_R2")["electrode"][0]["electrode"] == "R2"
    assert "papers of R1, R2: which probe is it?" in judged.refused(
        "enclose", path.name, "-a", "dopamine", "--in-place", "--again"
    )


def test_what_isnt_ours_is_never_overwritten(judged: Any, recording: Path) -> None:
    other = write_nwb(recording.with_name("rec-R1.enclosed.nwb"))
    before = sha256(other)
    assert "is no copy of ours" in judged.refused("enclose", "rec-R1.nwb", *ASKED)
    assert "is no copy of ours" in judged.refused("enclose", "rec-R1.nwb", *ASKED, "--again")
    assert sha256(other) == before
    judged.ok("enclose", "rec-R1.nwb", *ASKED, "--out", "mine.nwb")
    assert "is the recording itself" in judged.refused("enclose", "mine.nwb", *ASKED, "--again", "--out", "mine.nwb")


def test_in_place_leaves_links_and_refuses_what_is_protected(judged: Any, recording: Path) -> None:
    link = recording.with_name("link.nwb")
    link.symlink_to(recording.name)
    recording.chmod(0o444)
    assert "is write-protected" in judged.refused("enclose", "link.nwb", *ASKED, "--in-place")
    recording.chmod(0o640)
    judged.ok("enclose", "link.nwb", *ASKED, "--in-place")
    assert link.is_symlink()
    assert recording.stat().st_mode & 0o777 == 0o640
    assert "electrode" in tables(recording)
    assert "can't both be" in judged.refused("enclose", "rec-R1.nwb", *ASKED, "--in-place", "--out", "x.nwb")


def test_a_copy_elsewhere_would_lose_what_lies_beside_the_file(judged: Any, recording: Path) -> None:
    with h5py.File(recording.with_name("raw.h5"), "w") as other:
        other["x"] = np.arange(3)
    with patched(recording) as file:
        file["acquisition/raw"] = h5py.ExternalLink("raw.h5", "/x")
    (recording.parent / "elsewhere").mkdir()
    said = judged.refused("enclose", "rec-R1.nwb", *ASKED, "--out", "elsewhere/x.nwb")
    assert "/acquisition/raw lies in another file" in said
    assert "there is no such folder" in judged.refused("enclose", "rec-R1.nwb", *ASKED, "--out", "nowhere/x.nwb")
    assert list((recording.parent / "elsewhere").iterdir()) == []


def test_a_label_with_signs_that_no_name_may_hold(judged: Any, recording: Path) -> None:
    judged.ok("new", "K/1")
    judged.ok("new", "K:1")
    asked = ("-a", "dopamine", "-w", "triangle", "-s", "in-vivo")
    judged.ok("enclose", "rec-R1.nwb", *asked, "-p", "K/1")
    assert tables(recording.with_name("rec-R1.enclosed.nwb"), "electrolog_K_1")["electrode"][0]["electrode"] == "K/1"
    assert "are of K/1" in judged.refused("enclose", "rec-R1.nwb", *asked, "-p", "K:1")


# --- the concentration ------------------------------------------------------------------------------------


def test_the_concentration_is_that_of_convert_and_holds_the_truth(judged: Any, recording: Path) -> None:
    judged.ok("enclose", "rec-R1.nwb", *ASKED, "--convert")
    path = recording.with_name("rec-R1.enclosed.nwb")
    with (recording.parent / "rec-R1.csv").open("w", encoding="utf-8", newline="") as file:
        currents = (CURRENT_NA * 1e-9).astype(np.float32).astype(float) * 1e9
        csv.writer(file).writerows([("time_s", "current_na"), *zip(TIME_S, map(repr, currents.tolist()), strict=True)])
    judged.ok("convert", "rec-R1.csv", "--probe", "R1", "--analyte", "dopamine", "--start", RUN.isoformat())
    told = np.genfromtxt(recording.parent / "rec-R1.concentration.csv", delimiter=",", names=True)
    for name, column in (("", "concentration_um"), ("_low", "low_um"), ("_high", "high_um")):
        values, unit, times = series(path, f"concentration_current{name}")
        assert unit == "micromolar"
        np.testing.assert_array_equal(times, TIME_S)
        np.testing.assert_allclose(values, told[column], rtol=1e-8)
    median, low, high = (series(path, f"concentration_current{end}")[0] for end in ("", "_low", "_high"))
    assert np.abs(median / TRUTH_UM - 1).max() < 0.05
    assert ((low < TRUTH_UM) & (high > TRUTH_UM)).mean() > 0.9
    account = json.loads((recording.parent / "rec-R1.concentration.json").read_text(encoding="utf-8"))
    found = tables(path)
    rests_on = {row["what"]: row["value"] for row in found["conversion"]}
    assert rests_on["before.calibration"] == account["before"]["calibration"] == "R1/0"
    assert float(rests_on["curve.offset_na"]) == account["curve"]["offset_na"]
    assert rests_on["fit.fingerprint"] == account["fit"]["fingerprint"]
    assert [row["median_na_um"] for row in found["sensitivity"]] == pytest.approx(
        [one["median_na_um"] for one in account["sensitivity"]], rel=1e-9
    )


def test_nanomolar_is_a_thousand_to_the_micromolar(judged: Any, recording: Path) -> None:
    judged.ok("enclose", "rec-R1.nwb", *ASKED, "--convert", "--out", "um.nwb")
    judged.ok("enclose", "rec-R1.nwb", *ASKED, "--convert", "--unit", "nM", "--out", "nm.nwb")
    micro, nano = (series(recording.with_name(name), "concentration_current") for name in ("um.nwb", "nm.nwb"))
    assert (micro[1], nano[1]) == ("micromolar", "nanomolar")
    np.testing.assert_allclose(nano[0], micro[0] * 1000, rtol=1e-12)


@pytest.mark.parametrize(
    ("unit", "data", "conversion"),
    [
        ("amperes", CURRENT_NA * 1e-9, 1.0),
        ("amperes", CURRENT_NA, 1e-9),
        ("nA", CURRENT_NA, 1.0),
        ("picoamperes", CURRENT_NA * 1e3, 1.0),
        ("A", (CURRENT_NA * 1e-9)[:, np.newaxis], 1.0),
    ],
)
def test_any_unit_of_current_gives_the_same(
    judged: Any, recording: Path, unit: str, data: np.ndarray, conversion: float
) -> None:
    write_nwb(recording, began=RUN, data=data, unit=unit, conversion=conversion, rate_hz=0.5)
    judged.ok("enclose", "rec-R1.nwb", *ASKED, "--convert")
    values, _, _ = series(recording.with_name("rec-R1.enclosed.nwb"), "concentration_current")
    assert np.abs(values / TRUTH_UM - 1).max() < 0.05


def test_a_series_that_cannot_be_converted_is_refused_with_those_there_are(judged: Any, recording: Path) -> None:
    def refused(*options: str) -> str:
        said: str = judged.refused("enclose", "rec-R1.nwb", *ASKED, "--convert", *options)
        assert "found: current (" in said
        return said

    assert "no series is called 'curent'" in refused("--series", "curent")
    write_nwb(recording, began=RUN, data=CURRENT_NA, unit="volts")
    assert "none of its series could be the current" in refused()
    assert "is in 'volts'; accepted: a unit of current" in refused("--series", "current")
    write_nwb(recording, began=RUN, data=np.ones((500, 40)))
    assert "has the shape (500, 40)" in refused("--series", "current")
    with NWBHDF5IO(str(write_nwb(recording, began=RUN)), "a") as io:
        file = io.read()
        file.add_acquisition(TimeSeries(name="other", data=np.ones(3601), unit="amperes", rate=0.5))
        io.write(file)
    assert "2 of its series could be the current" in refused()
    judged.ok("enclose", "rec-R1.nwb", *ASKED, "--convert", "--series", "other")
    assert list(recording.parent.glob("rec-R1.enclosed*")) == [recording.with_name("rec-R1.enclosed.nwb")]


# --- what can be wrong ------------------------------------------------------------------------------------


def test_what_isnt_known_is_refused_and_nothing_is_left_behind(judged: Any, recording: Path) -> None:
    listed = sorted(path.name for path in recording.parent.iterdir())
    asked = ("enclose", "rec-R1.nwb")
    assert "no probe is called 'R7'; the nearest labels are R" in judged.refused(*asked, "-a", "dopamine", "-p", "R7")
    assert "no analyte is called 'dopamin'" in judged.refused(*asked, "-a", "dopamin", "-p", "R1")
    assert "accepted: uM, nM" in judged.refused(*asked, *ASKED, "--unit", "M")
    assert "accepted: --convert with --series" in judged.refused(*asked, *ASKED, "--series", "current")
    assert "there is no such file" in judged.refused("enclose", "rec-R9.nwb", *ASKED)
    assert "no exposure 999" in judged.refused(*asked, *ASKED, "--exposure", "999")
    recording.with_name("cut.nwb").write_bytes(recording.read_bytes()[:50_000])
    assert "cut.nwb: is cut short" in judged.refused("enclose", "cut.nwb", *ASKED)
    recording.with_name("cut.nwb").unlink()
    assert sorted(path.name for path in recording.parent.iterdir()) == listed


def test_a_run_that_isnt_on_record_can_be_judged_but_not_converted(judged: Any, recording: Path) -> None:
    write_nwb(recording.with_name("later.nwb"), began=RUN + timedelta(days=30))
    assert "its run isn't on record" in judged.refused("enclose", "later.nwb", *ASKED, "--convert")
    assert "no verdict: where the probe was isn't known" in judged.ok("enclose", "later.nwb", *ASKED).out
    out = judged.ok("enclose", "later.nwb", *ASKED, "--again", "--setting", "in-vivo").out
    assert "verdict [+] FIT" in out


def test_without_a_factor_or_a_fit_it_says_what_is_missing(cli: Any, tmp_path: Path) -> None:
    write_nwb(tmp_path / "B9-01.nwb", began=BEGAN)
    out = cli.ok("enclose", "B9-01.nwb", "-a", "DA", "-w", "triangle").out
    assert "no factor: it had no calibration with dopamine" in " ".join(out.split())
    assert {"factor", "calibrations"}.isdisjoint(tables(tmp_path / "B9-01.enclosed.nwb", "electrolog_B9-01"))


def test_the_copy_is_the_same_run_and_names_its_probe(judged: Any, recording: Path, tmp_path: Path) -> None:
    later = write_nwb(tmp_path / "rig" / "nameless.nwb", began=RUN - timedelta(days=2))
    judged.ok("enclose", "rig/nameless.nwb", *ASKED)
    later.unlink()
    (run,) = judged.ok("runs", "rig", "--setting", "in-vivo", "--commit", "--json").json["runs"]
    assert (run["state"], run["electrode"], run["electrode_from"]) == ("new", "R1", "its own entry")
    assert "nameless" in [row["recording"] for row in open_lab(judged.db).rows("exposures")]
    said = judged.ok("runs", "rig", "--setting", "in-vivo", "--probe", "R2", "--json").json["runs"][0]["said"]
    assert "--probe says R2, the papers in the file are of R1" in said[0]


@pytest.mark.parametrize("seed", range(6))
def test_damaged_bytes_are_a_refusal_or_borne_and_never_spread(judged: Any, recording: Path, seed: int) -> None:
    rng = np.random.default_rng(seed)
    content = bytearray(recording.read_bytes())
    for place in rng.integers(0, len(content), 30).tolist():
        content[place] = int(rng.integers(0, 256))
    recording.write_bytes(content)
    answer = judged("enclose", "rec-R1.nwb", *ASKED)
    assert "an error in electrolog itself" not in answer.err
    assert answer.status in (0, 1, 2)
    assert recording.read_bytes() == content
    if answer.status:
        assert [path.name for path in recording.parent.iterdir() if "record.db" not in path.name] == ["rec-R1.nwb"]


def test_a_kill_at_any_moment_leaves_the_recording_whole(judged: Any, recording: Path) -> None:
    before = sha256(recording)
    command = [sys.executable, "-m", "electrolog", "--db", judged.db, "enclose", "rec-R1.nwb", *ASKED, "--convert"]
    begun = time.perf_counter()
    subprocess.run([*command, "--out", "elsewhere.nwb"], check=True, capture_output=True, cwd=recording.parent)
    whole_s = time.perf_counter() - begun
    killed = 0
    for part in (0.3, 0.5, 0.7, 0.9):
        with subprocess.Popen(
            [*command, "--in-place"], stdout=subprocess.DEVNULL, stderr=subprocess.DEVNULL
        ) as running:
            with contextlib.suppress(subprocess.TimeoutExpired):
                running.wait(part * whole_s)
            killed += running.poll() is None
            running.kill()
        if sha256(recording) != before:  # it was done already
            assert "electrode" in tables(recording)
            break
    assert killed
    assert datasets(recording)


WITHOUT = (
    "import sys; sys.modules[{module!r}] = None; from electrolog.cli.main import main; sys.exit(main({arguments}))"
)


@pytest.mark.parametrize("module", ["pynwb", "h5py"])
def test_without_the_library_a_plain_sentence_says_how_to_get_it(judged: Any, recording: Path, module: str) -> None:
    arguments = ["--db", judged.db, "enclose", "rec-R1.nwb", *ASKED]
    code = WITHOUT.format(module=module, arguments=arguments)
    done = subprocess.run([sys.executable, "-c", code], check=False, capture_output=True, encoding="utf-8")
    assert (done.returncode, done.stdout) == (2, "")
    assert f"rec-R1.nwb: reading NWB needs {module}, which isn't installed" in done.stderr
    assert "python -m pip install" in done.stderr
    assert done.stderr.count("\n") == 1


def test_python_does_the_same(judged: Any, recording: Path) -> None:
    found = open_lab(judged.db).enclose(recording, "dopamine", probe="R1", convert=True)
    assert found.verdict is not None
    assert found.verdict.verdict == "fit"
    assert found.factor is not None
    assert found.factor.in_force is True
    assert Path(found.target).samefile(recording.with_name("rec-R1.enclosed.nwb"))
    assert found.series == ("concentration_current", "concentration_current_low", "concentration_current_high")
    assert found.tables["calibration_points"] == 12
