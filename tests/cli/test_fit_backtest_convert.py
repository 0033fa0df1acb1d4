"""What the lab has learned, whether to believe it, and a recording turned into concentrations."""

from __future__ import annotations

import csv
import json
import re
import shutil
import sqlite3
from contextlib import closing
from pathlib import Path
from typing import Any

import numpy as np
import pytest

from electrolog.lab import open_lab
from tests.cli import fouled_lab
from tests.cli.conftest import Terminal

ASKED = ("--analyte", "dopamine")


@pytest.fixture(scope="module")
def fitted_record(empty_record: Path, tmp_path_factory: pytest.TempPathFactory) -> Path:
    """The known lab, imported, with its cohort's fit kept."""
    folder = tmp_path_factory.mktemp("fouled")
    path = Path(shutil.copy(empty_record, folder / "fitted.db"))
    fouled_lab.fouled_lab(folder / "exchange")
    with pytest.MonkeyPatch.context() as patch:
        terminal = Terminal(str(path), patch)
        terminal.ok("import", str(folder / "exchange"))
        terminal.ok("fit", *ASKED)
    return path


@pytest.fixture
def lab(fitted_record: Path, tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Terminal:
    monkeypatch.chdir(tmp_path)
    return Terminal(str(shutil.copy(fitted_record, tmp_path / "record.db")), monkeypatch)


# --- fit --------------------------------------------------------------------------------------------------


def test_a_fit_tells_the_half_life_that_the_lab_was_made_with(lab: Terminal) -> None:
    (half_life,) = lab.ok("fit", *ASKED, "--json").json["half_lives"]
    hours = half_life["hours"]
    true_h = np.log(2) / fouled_lab.RATE
    assert hours["low"] < true_h < hours["high"]
    assert hours["high"] / hours["low"] < 2.0
    assert (half_life["probes"], half_life["calibrations"]) == (34, 132)


def test_a_fit_names_the_weak_standards_day_and_no_other(lab: Terminal) -> None:
    (day,) = lab.ok("fit", *ASKED, "--json").json["suspicious_days"]
    made = fouled_lab.FIRST + fouled_lab.BAD_DAY * fouled_lab.BETWEEN_DAYS
    assert day["date"] == made.date().isoformat()
    assert day["effect"]["low"] < -0.15 < day["effect"]["high"]
    assert day["date"] in lab.ok("fit", *ASKED).out


def test_a_kept_fit_is_shown_again_and_a_fresh_one_is_the_same(lab: Terminal) -> None:
    kept, again, fresh = (lab.ok("fit", *ASKED, *more, "--json").json for more in ((), (), ("--fresh",)))
    assert kept == again
    assert fresh["made_at"] > kept["made_at"]
    assert {**fresh, "made_at": None} == {**kept, "made_at": None}


FIRST = "(SELECT min(unit) FROM kept_fit_units)"
CHANGES = (
    "UPDATE kept_fits SET fit = substr(fit, 1, 64) || '{}'",
    "UPDATE kept_fits SET fit = replace(fit, 'A', 'B')",  # other numbers, and nothing else would show it
    "UPDATE kept_fits SET fit = ''",
    "UPDATE kept_fits SET seen_readings = seen_readings + 1",
    "UPDATE kept_fits SET seen_newest = seen_newest + 1000",  # as if it had seen more than any fit to come
    "UPDATE kept_fits SET made_at = '1999-01-01T00:00:00.000000Z'",
    "UPDATE kept_fits SET made_at = 'soon'",
    "UPDATE kept_fits SET fingerprint = CAST(X'FF' AS TEXT)",  # no text any more
    "UPDATE kept_fit_units SET fit = replace(fit, 'A', 'B')",
    f"UPDATE kept_fit_units SET fit = CAST(X'FF' AS TEXT) WHERE unit = {FIRST}",
    f"UPDATE kept_fit_units SET unit = 'another' WHERE unit = {FIRST}",
    f"DELETE FROM kept_fit_units WHERE unit = {FIRST}",
)


@pytest.mark.parametrize("change", ["UPDATE kept_fits SET method = 'cohort-0'", *CHANGES])
def test_a_kept_fit_that_is_not_what_was_kept_is_made_again(lab: Terminal, tmp_path: Path, change: str) -> None:
    before = lab.ok("fit", *ASKED, "--json").json
    spoil_kept_fit(tmp_path, change)
    after = lab.ok("fit", *ASKED, "--json").json
    assert after["made_at"] > before["made_at"]
    assert {**after, "made_at": None} == {**before, "made_at": None}


@pytest.mark.parametrize("change", CHANGES)
def test_a_kept_fit_that_was_changed_is_named_until_it_is_made_again(
    lab: Terminal, tmp_path: Path, change: str
) -> None:
    lab.ok("fit", *ASKED)
    lab.ok("verify")
    spoil_kept_fit(tmp_path, change)
    told = lab("verify")
    assert told.status == 1
    assert "kept fit of dopamine: was changed since it was kept" in told.out + told.err
    lab.ok("fit", *ASKED)
    lab.ok("verify")


def spoil_kept_fit(folder: Path, change: str) -> None:
    with closing(sqlite3.connect(folder / "record.db")) as record, record:
        record.execute("PRAGMA ignore_check_constraints = ON")
        record.execute(change)


def test_a_unit_whose_part_of_the_fit_went_astray_is_not_taken_for_a_new_one(lab: Terminal, tmp_path: Path) -> None:
    asked = ("forecast", "--all", *ASKED, "--waveform", "triangle", "--setting", "in-vivo", "--run", "2h", "--json")
    before = lab.ok(*asked).json
    spoil_kept_fit(tmp_path, "UPDATE kept_fit_units SET unit = 'another' || unit")
    assert lab.ok(*asked).json == before


def test_a_fit_says_what_it_rests_on(lab: Terminal) -> None:
    out = lab.ok("fit", *ASKED).out
    assert "132 calibrations of 34 probes" in out
    assert "shape of loss" in out
    assert "did not converge" not in out


def test_a_fit_without_a_calibration_or_with_an_unknown_analyte_is_refused(empty: Terminal) -> None:
    assert "nothing to fit" in empty.refused("fit", *ASKED, status=1)
    assert "dopamine" in empty.refused("fit", "--analyte", "dopamin")


# --- backtest ---------------------------------------------------------------------------------------------


def test_forecasts_of_a_known_lab_hold_and_beat_the_simple_ways(lab: Terminal) -> None:
    found = lab.ok("backtest", *ASKED, "--cuts", "2", "--json").json
    ours, *rivals = found["methods"]
    assert [one["method"] for one in rivals] == ["last value", "own line", "linear mixed model", "cohort mean"]
    assert all(ours["crps"] < 0.8 * rival["crps"] for rival in rivals if rival["method"] != "linear mixed model")
    assert all(ours["crps"] < rival["crps"] for rival in rivals)  # this lab's probes do fall along straight lines
    assert all(ours["log_score"] < rival["log_score"] for rival in rivals)
    low, high = ours["coverage_interval"]["0.9"]
    assert low <= 0.9 <= high
    assert sum(ours["pit_counts"]) == found["forecasts"]
    assert len(found["cuts"]) == 2
    assert "aren't set" in found["no_verdicts"]
    assert found["cuts"][0]["calibrations"] < found["cuts"][1]["calibrations"] < 132


def test_the_table_counts_fit_verdicts_once_limits_are_set(lab: Terminal) -> None:
    lab.ok("limits", "set", "accepted-risk", "10%")
    lab.ok("limits", "set", "least-share-left", "60%")
    out = " ".join(lab.ok("backtest", *ASKED, "--cuts", "1").out.split())
    assert "fitted anew on 2026-" in out
    counted = re.search(r"of (\d+) runs .*, (\d+) would have been called fit .*; (\d+) of these broke", out)
    expected = re.search(r"expected ([\d.]+)", out)
    assert counted
    assert expected
    runs, fit, wrong = (int(number) for number in counted.groups())
    assert 0 < fit < runs
    assert wrong <= 0.2 * fit
    assert float(expected[1]) < 0.2 * fit


def test_a_backtest_in_sentences_has_neither_bars_nor_columns(lab: Terminal) -> None:
    out = lab.ok("backtest", *ASKED, "--cuts", "1", "--plain").out
    assert "##" not in out
    assert "─" not in out
    assert re.search(r"electrolog: CRPS 0\.\d+, median 0\.\d+, log score", out)
    assert re.search(r"  0\.9-1\.0 \d+\n", out)


def test_no_forecast_peeks_at_what_came_later(lab: Terminal) -> None:
    """The last calibration of every probe is made ten times what it was: no other forecast may move."""
    asked = ("backtest", *ASKED, "--cuts", "1", "--csv")
    before = rows(lab.ok(*asked).out)
    last = f"/{fouled_lab.ROUNDS - 1}"
    latest = max(row["calibration"] for row in before if row["calibration"].endswith(last))
    value = next(row["reading_na_um"] for row in before if row["calibration"] == latest)
    lab.ok("amend", "calibration", latest, f"sensitivity_na_um={10 * float(value)}", "--why", "to see who peeks")
    after = rows(lab.ok(*asked).out)
    told = ("calibration", "cut", "low_na_um", "median_na_um", "high_na_um")
    assert [[row[name] for name in told] for row in before] == [[row[name] for name in told] for row in after]
    changed = [row["calibration"] for row, now in zip(before, after, strict=True) if row["crps"] != now["crps"]]
    assert changed == [latest]


def test_a_lab_with_too_little_says_so(cli: Terminal) -> None:
    said = cli.refused("backtest", *ASKED, status=1)
    assert "too little to test on" in said
    assert "of the same probe and waveform: 1; needed are 17" in said


def test_an_impossible_count_of_cuts_is_refused(lab: Terminal) -> None:
    assert "accepted: 1 to 50" in lab.refused("backtest", *ASKED, "--cuts", "0")


def rows(text: str) -> list[dict[str, str]]:
    return list(csv.DictReader(text.splitlines()))


# --- convert ----------------------------------------------------------------------------------------------

TIME_S = np.arange(0.0, 4 * 3600.0, 2.0)
TRUE_UM = 1.0 + 0.5 * np.sin(TIME_S / 600)


def sensitivity_na_um(time_s: np.ndarray) -> np.ndarray:
    return np.exp(fouled_lab.LEVEL - fouled_lab.RATE * time_s / 3600)


def currents_na(affinity_per_um: float = 0.0) -> np.ndarray:
    return sensitivity_na_um(TIME_S) * TRUE_UM / (1 + affinity_per_um * TRUE_UM)


def write_csv(path: Path, time_s: np.ndarray, current_na: np.ndarray, names: str = "time_s,current_na") -> str:
    lines = [f"{t:.6g},{'' if np.isnan(i) else f'{i:.8g}'}" for t, i in zip(time_s, current_na, strict=True)]
    path.write_text("\n".join([names, *lines]) + "\n", encoding="utf-8")
    return str(path)


def converted(path: Path) -> dict[str, np.ndarray]:
    with path.open(encoding="utf-8", newline="") as file:
        found = list(csv.DictReader(file))
    return {name: np.array([float(row[name] or "nan") for row in found]) for name in found[0]}


def convert(lab: Terminal, file: str, probe: str = "R1", *more: str) -> Any:
    return lab.ok("convert", file, "--probe", probe, *ASKED, *more, "--json").json


@pytest.mark.parametrize(("probe", "affinity_per_um"), [("R1", 0.0), ("R2", fouled_lab.AFFINITY_PER_UM)])
def test_a_recording_becomes_the_concentrations_it_was_made_from(
    probe: str, affinity_per_um: float, lab: Terminal, tmp_path: Path
) -> None:
    """The straight and the saturating calibration; found by the recording's own name."""
    convert(lab, write_csv(tmp_path / f"rec-{probe}.csv", TIME_S, currents_na(affinity_per_um)), probe)
    found = converted(tmp_path / f"rec-{probe}.concentration.csv")
    inside = (found["low_um"] < TRUE_UM) & (found["high_um"] > TRUE_UM)
    assert inside.mean() > 0.9
    assert np.abs(found["concentration_um"] / TRUE_UM - 1).max() < 0.06
    assert (found["high_um"] / found["low_um"]).max() < 1.5


def test_a_fixed_factor_is_said_to_be_off_by_what_it_is(lab: Terminal, tmp_path: Path) -> None:
    found = convert(lab, write_csv(tmp_path / "a.csv", TIME_S, currents_na()))
    pre, post = found["fixed_factors"]
    assert (pre["calibration"], post["calibration"]) == ("R1/0", "R1/1")
    assert pre["off_at_end"]["median"] == pytest.approx(np.exp(-4 * fouled_lab.RATE) - 1, abs=0.04)
    assert post["off_at_end"]["median"] == pytest.approx(0.0, abs=0.04)
    assert post["off_on_average"]["median"] == pytest.approx(np.exp(2 * fouled_lab.RATE) - 1, abs=0.04)


def test_what_it_rests_on_stands_beside_it(lab: Terminal, tmp_path: Path) -> None:
    found = convert(lab, write_csv(tmp_path / "a.csv", TIME_S, currents_na()))
    account = json.loads(Path(found["account"]).read_text(encoding="utf-8"))
    assert (account["before"]["calibration"], account["after"]["calibration"]) == ("R1/0", "R1/1")
    assert len(account["sensitivity"]) == 241
    assert len(account["sha256"]) == 64
    assert account["warnings"] == list(found["warnings"])


def test_without_a_post_calibration_it_goes_forward_and_wider(lab: Terminal, tmp_path: Path) -> None:
    file = write_csv(tmp_path / "a.csv", TIME_S, currents_na())
    both = convert(lab, file, "R1", "--out", "both.csv")
    lab.ok("strike", "calibration", "R1/1", "--why", "to see what it was worth")
    alone = convert(lab, file, "R1", "--out", "alone.csv")
    assert alone["after"] is None
    assert any("no calibration after the run" in warning for warning in alone["warnings"])
    assert width(alone["sensitivity_na_um"]["end"]) > 1.5 * width(both["sensitivity_na_um"]["end"])
    lab.ok("strike", "calibration", "R1/0", "--why", "and without any")
    assert "can't become a number" in lab.refused("convert", file, "-p", "R1", *ASKED, "-w", "triangle", status=1)


def test_a_background_that_tells_in_this_lab_sharpens_what_no_post_calibration_did(
    lab: Terminal, tmp_path: Path
) -> None:
    lab.ok("strike", "calibration", "R1/1", "--why", "to see what the background is worth")
    file = write_csv(tmp_path / "a.csv", TIME_S, currents_na())
    fallen = 160 * np.exp(-fouled_lab.FOLLOWS * 4 * fouled_lab.RATE)
    alone = convert(lab, file, "R1", "--out", "alone.csv")["sensitivity_na_um"]["end"]
    found = convert(lab, file, "R1", "--background", f"160nA,{fallen}nA", "--out", "both.csv")
    sharpened = found["sensitivity_na_um"]["end"]
    assert width(sharpened) < 0.8 * width(alone)
    assert sharpened["low"] < sensitivity_na_um(TIME_S[-1:])[0] < sharpened["high"]
    assert any("the background sharpens it" in warning for warning in found["warnings"])
    account = json.loads((tmp_path / "both.json").read_text(encoding="utf-8"))
    assert account["background_trial"]["law"]["slope"] == pytest.approx(fouled_lab.FOLLOWS, abs=0.1)
    assert "two currents above zero" in lab.refused("convert", file, "-p", "R1", *ASKED, "--background", "160,0")


def width(spread: dict[str, float]) -> float:
    return float(np.log(spread["high"] / spread["low"]))


def test_gaps_and_missing_samples_are_borne_and_said(lab: Terminal, tmp_path: Path) -> None:
    current = currents_na()
    current[100:120] = np.nan
    kept = np.r_[0:3000, 3100 : len(TIME_S)]
    found = convert(lab, write_csv(tmp_path / "a.csv", TIME_S[kept], current[kept]))
    assert any("20 of 7100 samples have no current" in warning for warning in found["warnings"])
    assert any("gap of 202 s" in warning for warning in found["warnings"])
    result = converted(tmp_path / "a.concentration.csv")
    assert np.flatnonzero(np.isnan(result["concentration_um"])).tolist() == list(range(100, 120))


def test_units_are_read_from_the_columns_names(lab: Terminal, tmp_path: Path) -> None:
    plain = write_csv(tmp_path / "plain.csv", TIME_S, currents_na())
    other = write_csv(tmp_path / "other.csv", TIME_S / 60, currents_na() * 1e3, "time_min,current_pa")
    convert(lab, plain)
    convert(lab, other)
    found, same = (converted(tmp_path / f"{name}.concentration.csv") for name in ("plain", "other"))
    assert np.allclose(found["concentration_um"], same["concentration_um"], rtol=1e-4)
    unknown = write_csv(tmp_path / "unknown.csv", TIME_S, currents_na(), "seconds,nanoamperes")
    assert "time_s" in lab.refused("convert", unknown, "-p", "R1", *ASKED)


def test_npy_and_hdf5_are_read_like_csv(lab: Terminal, tmp_path: Path) -> None:
    h5py = pytest.importorskip("h5py")
    np.save(tmp_path / "a.npy", np.column_stack([TIME_S, currents_na()]))
    with h5py.File(tmp_path / "b.h5", "w") as file:
        file["time_s"], file["current_na"] = TIME_S, currents_na()
    for name in ("a.npy", "b.h5"):
        convert(lab, name)
    first, second = (converted(tmp_path / f"{name}.concentration.csv") for name in "ab")
    assert np.array_equal(first["concentration_um"], second["concentration_um"])


def test_a_recording_that_can_not_be_of_the_run_is_refused(lab: Terminal, tmp_path: Path) -> None:
    long = write_csv(tmp_path / "long.csv", TIME_S * 1.5, currents_na())
    assert "the recording runs from 0 to" in lab.refused("convert", long, "-p", "R1", *ASKED)
    backwards = write_csv(tmp_path / "back.csv", TIME_S[::-1], currents_na())
    assert "runs backwards" in lab.refused("convert", backwards, "-p", "R1", *ASKED)
    assert "names 2 probes" in lab.refused("convert", long, "-p", "R1,R2", *ASKED)
    assert "no probe is called 'R9'" in lab.refused("convert", long, "-p", "R9", *ASKED)
    several = write_csv(tmp_path / "several.csv", TIME_S, currents_na())
    assert "which exposure is it" in lab.refused("convert", several, "-p", "G0-0", *ASKED)
    assert not list(tmp_path.glob("*.concentration.*"))


@pytest.mark.parametrize(
    ("name", "text", "said"),
    [
        ("empty.csv", "time_s,current_na\n", "0 samples are no recording"),
        ("words.csv", "time_s,current_na\n" + "1,2\n" * 3 + "2,much\n", "line 5, column 2: 'much' is not a number"),
        ("silent.csv", "time_s,current_na\n" + "".join(f"{k},\n" for k in range(30)), "no current at all"),
        ("recording.txt", "time_s,current_na\n1,2\n", "is no kind of recording"),
    ],
)
def test_a_file_that_is_no_recording_is_refused(name: str, text: str, said: str, lab: Terminal, tmp_path: Path) -> None:
    (tmp_path / name).write_text(text, encoding="utf-8")
    assert said in lab.refused("convert", name, "-p", "R1", *ASKED)
    assert "no such file" in lab.refused("convert", f"not-{name}", "-p", "R1", *ASKED)


def test_an_exposure_logged_twice_is_pointed_at(lab: Terminal, tmp_path: Path) -> None:
    """Both are counted, so the sensitivity would come out too low without a word."""
    start = fouled_lab.FIRST + fouled_lab.DAYS * fouled_lab.BETWEEN_DAYS + fouled_lab.timedelta(hours=3)
    run = ("-s", "in-vivo", "-w", "triangle", "--for", "1h", "--start", start.isoformat(), "--yes")
    lab.ok("expose", "R1", *run)
    found = convert(lab, write_csv(tmp_path / "rec-R1.csv", TIME_S, currents_na()))
    assert any("is logged for a part of the same time" in warning for warning in found["warnings"])


def test_a_lab_of_one_calibration_gets_a_wide_answer_that_says_what_it_rests_on(empty: Terminal) -> None:
    empty.ok("new", "A1")
    at = ("-w", "triangle", "--at", "2026-01-07T09:00Z")
    empty.ok("calibrate", "A1", "pre", "DA", "0:0", "0.5uM:5", "1uM:10.1", *at)
    found = empty.ok("fit", *ASKED, "--json").json
    assert found["calibrations"] == 1
    hours = found["half_lives"][0]["hours"]
    assert hours["high"] is None or hours["high"] > 10 * hours["low"]
    assert any("no probe has calibrations with exposure between them" in note for note in found["notes"])


def test_a_calibration_without_a_logarithm_is_left_out_by_name(lab: Terminal) -> None:
    lab.ok("amend", "calibration", "G0-0/1", "sensitivity_na_um=-3", "--why", "to see it named")
    found = lab.ok("fit", *ASKED, "--json").json
    assert found["calibrations"] == 131
    assert any(note.startswith("G0-0/1 is left out") for note in found["notes"])


def test_nothing_is_overwritten(lab: Terminal, tmp_path: Path) -> None:
    file = write_csv(tmp_path / "a.csv", TIME_S, currents_na())
    convert(lab, file)
    first = (tmp_path / "a.concentration.csv").read_bytes()
    assert "nothing is overwritten" in lab.refused("convert", file, "-p", "R1", *ASKED)
    assert "nothing is overwritten" in lab.refused("convert", file, "-p", "R1", *ASKED, "--out", file)
    assert (tmp_path / "a.concentration.csv").read_bytes() == first


def test_the_door_gives_arrays(lab: Terminal, tmp_path: Path) -> None:
    file = write_csv(tmp_path / "a.csv", TIME_S, currents_na())
    found = open_lab(lab.db).convert(Path(file), "R1", "dopamine", "triangle")
    assert found.concentration_um.shape == found.low_um.shape == found.high_um.shape == TIME_S.shape
    assert found.sensitivity_start.low < sensitivity_na_um(np.zeros(1))[0] < found.sensitivity_start.high
