"""Why a probe got worse, and whether kinds of probes differ, on records in which the answer is known."""

from __future__ import annotations

import shutil
from pathlib import Path
from typing import Any

import pytest

from tests.cli.conftest import JUDGED_AT, POINTS, Terminal
from tests.cli.fouled_lab import BAD_DAY, BETWEEN_DAYS, FIRST, GROUPS, PER_GROUP

ASKED = ("--analyte", "dopamine")
LATER = ("-w", "triangle", "--at", JUDGED_AT)


@pytest.fixture(scope="module")
def grouped_record(judged_record: Path, tmp_path_factory: pytest.TempPathFactory) -> Path:
    """Every second probe made by one person, the others by another; the fit kept again."""
    path = Path(shutil.copy(judged_record, tmp_path_factory.mktemp("grouped") / "grouped.db"))
    with pytest.MonkeyPatch.context() as patch:
        patch.setenv("ELECTROLOG_NOW", JUDGED_AT)
        cli = Terminal(str(path), patch)
        cli.ok("new", "--batch", "W", "--count", "1", "--made-by", "wren")
        cli.ok("new", "--batch", "F", "--count", "1", "--made-by", "finch")
        names = [f"G{group}-{k}" for group in range(GROUPS) for k in range(PER_GROUP)] + ["R1", "R2"]
        for place, name in enumerate(names):
            cli.ok("amend", "probe", name, f"batch={'WF'[place % 2]}", "--why", "who made it")
        cli.ok("fit", *ASKED)
    return path


@pytest.fixture
def grouped(grouped_record: Path, tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Terminal:
    monkeypatch.setenv("ELECTROLOG_NOW", JUDGED_AT)
    return Terminal(str(shutil.copy(grouped_record, tmp_path / "grouped.db")), monkeypatch)


def findings(judged: Terminal, probe: str, *more: str) -> dict[str, dict[str, Any]]:
    found = judged.ok("diagnose", probe, *ASKED, *more, "--json").json["diagnosis"]["findings"]
    return {one["cause"]: one for one in found}


def scaled(times: float) -> tuple[str, ...]:
    """Points of a calibration that reads so many times R1's last sensitivity."""
    slope = 10.0 * 0.787 * times  # four hours in vivo at 0.06 an hour
    return tuple(f"{level}uM:{slope * level + 0.1:.4f}" for level in (0, 0.25, 0.5, 1, 2, 4))


def test_a_loss_as_the_exposure_made_expect_is_fouling(judged: Terminal) -> None:
    found = findings(judged, "R1")
    assert found["fouling"]["judgement"] in ("likely", "possible")
    assert any("where the exposure made expect" in text for text in found["fouling"]["evidence_for"])
    assert found["a slip of entry"]["judgement"] == "unlikely"


def test_a_decimal_moved_is_a_slip_and_no_fouling(judged: Terminal) -> None:
    judged.ok("calibrate", "R1", "interim", "DA", *scaled(10.0), *LATER, "--yes")
    found = findings(judged, "R1")
    assert found["a slip of entry"]["judgement"] == "likely"
    assert found["fouling"]["judgement"] == "unlikely"


def test_a_weak_standard_shows_on_the_other_probes_of_its_day(judged: Terminal) -> None:
    """On that day every probe read 15 % less than it should."""
    day = FIRST + BAD_DAY * BETWEEN_DAYS
    found = findings(judged, "G2-1", "--at", day.replace(hour=22).isoformat())
    assert "other probes of that day" in " ".join(found["a bad standard"]["evidence_for"])
    assert found["a bad standard"]["judgement"] in ("likely", "possible")
    good = findings(judged, "G2-1", "--at", (day - BETWEEN_DAYS).replace(hour=22).isoformat())
    assert good["a bad standard"]["weight"] < found["a bad standard"]["weight"]


def test_peaks_noise_and_background_speak(judged: Terminal) -> None:
    judged.ok(
        "amend",
        "calibration",
        "R1/1",
        "oxidation_peak_v=0.60",
        "reduction_peak_v=-0.20",
        "background_na=100",
        "--why",
        "from the bench notes",
    )
    circumstances = ("--noise", "0.5nA", "--background", "170nA", "--oxidation", "0.75V", "--reduction", "-0.05V")
    judged.ok("calibrate", "R1", "interim", "DA", *scaled(0.9), *LATER, *circumstances, "--yes")
    judged.ok("inspect", "R1", "--seal", "no", "--at", JUDGED_AT)
    found = findings(judged, "R1")
    assert found["a drifting reference electrode"]["judgement"] == "likely"
    assert found["slower electron transfer"]["judgement"] == "unlikely"
    assert found["a failing seal"]["judgement"] == "likely"
    assert "both peaks together +150 mV" in found["a drifting reference electrode"]["evidence_for"]


def test_a_cleaning_between_the_two_is_said_to_hide_the_loss(judged: Terminal) -> None:
    judged.ok("clean", "R1", "-m", "isopropanol", "--at", "30min ago")
    judged.ok("calibrate", "R1", "post", "DA", *scaled(1.0), *LATER, "--yes")
    assert "it hides part of the loss" in judged.ok("diagnose", "R1", *ASKED).out


def test_one_calibration_shows_no_change(judged: Terminal) -> None:
    judged.ok("new", "N1")
    judged.ok("calibrate", "N1", "pre", "DA", *POINTS, *LATER)
    assert "two are needed to see a change" in judged.refused("diagnose", "N1", *ASKED, status=1)
    assert "never calibrated with serotonin" in judged.refused("diagnose", "R1", "--analyte", "serotonin")
    assert "nearest known one is 'R1'" in judged.refused("diagnose", "R11", *ASKED)


def test_groups_that_are_alike_are_not_called_different(grouped: Terminal) -> None:
    found = grouped.ok("compare", "--between", "maker", *ASKED, "--json").json["comparison"]
    assert {one["group"] for one in found["estimates"]} == {"finch", "wren"}
    assert all(one["p_holm"] is None or one["p_holm"] > 0.01 for one in found["differences"])
    losses = [one for one in found["estimates"] if one["measure"] == "loss per hour in vivo"]
    assert all(one["low"] < 0.06 * 1.3 and one["high"] > 0.06 * 0.8 for one in losses)


def test_retired_probes_count_and_those_in_use_are_censored(grouped: Terminal) -> None:
    for probe in ("G0-0", "G0-1", "G0-2"):
        grouped.ok("retire", probe, "-r", "fouled", "--at", "now")
    found = grouped.ok("compare", "--between", "maker", *ASKED, "--json").json["comparison"]
    lives = {one["group"]: one for one in found["estimates"] if one["measure"] == "survival"}
    assert sum(one["count"] for one in lives.values()) == 34
    assert lives["wren"]["value"] is None  # the others still live: the curve doesn't come down to one half


def test_the_share_left_is_no_test_of_its_own(grouped: Terminal) -> None:
    found = grouped.ok("compare", "--between", "maker", *ASKED, "--after", "5h", "--json").json["comparison"]
    p = {one["measure"]: one["p"] for one in found["differences"]}
    assert p["share left after 5 h"] == p["loss per hour in vivo"]
    tested = len([one for one in found["differences"] if one["p"] is not None])
    assert f"{tested - 1} comparisons" in found["said"]


def test_the_next_probes_go_where_they_tell_most(grouped: Terminal) -> None:
    found = grouped.ok("compare", "--between", "maker", *ASKED, "--more", "4", "--json").json["next"]
    assert sum(found["more"].values()) == 4
    assert found["widest_then"] < found["widest_now"]


@pytest.mark.parametrize(
    ("asked", "said"),
    [
        (("--between", "coating"), "1 groups by coating (none)"),
        (("--between", "colour"), "is not one of"),
        (("--between", "maker", "--after", "0h"), "hours above zero"),
        (("--between", "maker", "--more", "-1"), "none or more"),
    ],
)
def test_what_can_not_be_compared_is_said(judged: Terminal, asked: tuple[str, ...], said: str) -> None:
    answer = judged("compare", *asked, *ASKED)
    assert (answer.status > 0, answer.out) == (True, "")
    assert said in answer.err
