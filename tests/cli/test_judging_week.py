"""A week's runs are dealt out to probes, how long these last, and how many to make."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import pytest

from tests.cli.conftest import Terminal

HEADER = "label,start,duration,analyte,waveform,setting,needs"
TYPED = ("-a", "DA", "-w", "triangle", "-s", "in-vivo")
RUN = ("--analyte", "dopamine", "--waveform", "triangle", "--setting", "in-vivo", "--run", "2h")


def plan(folder: Path, *lines: str, header: str = HEADER) -> str:
    path = folder / "week.csv"
    path.write_text("\n".join([header, *lines]) + "\n", encoding="utf-8")
    return str(path)


def served(answer: Any) -> dict[str, str | None]:
    return {run["label"]: run["electrode"] for run in answer.json["runs"]}


def test_runs_at_the_same_time_get_probes_of_their_own(judged: Terminal, tmp_path: Path) -> None:
    lines = [f"R{k},2026-03-09T09:{k:02d}Z,2h,dopamine,triangle,in-vivo," for k in range(4)]
    found = judged.ok("assign", plan(tmp_path, *lines), "--json")
    probes = list(served(found).values())
    assert None not in probes
    assert len(set(probes)) == 4
    assert found.json["p_all"] >= 0.95**4


def test_the_odds_of_an_assigned_run_are_those_of_a_check(judged: Terminal) -> None:
    (run,) = judged.ok("assign", "--planned", "Mon=2026-03-09T09:00Z,2h", *TYPED, "--json").json["runs"]
    (alone,) = judged("check", run["electrode"], *RUN, "--json").json
    assert run["p_success"] == pytest.approx(1 - alone["p_breach"], abs=0.01)


def test_a_probe_used_on_monday_is_older_on_wednesday(judged: Terminal) -> None:
    for probe in judged.ok("shelf", "--json").json:
        if probe["electrode"] != "R1":
            judged.ok("retire", probe["electrode"], "-r", "broken", "--at", "now")
    days = ("--planned", "Mon=2026-03-09T09:00Z,1h", "--planned", "Wed=2026-03-11T09:00Z,1h")
    monday, wednesday = judged.ok("assign", *days, *TYPED, "--json").json["runs"]
    assert monday["electrode"] == wednesday["electrode"] == "R1"
    assert wednesday["used_before_min"] == pytest.approx(60)
    assert wednesday["p_success"] <= monday["p_success"]


def test_a_run_that_nobody_can_serve_says_why(judged: Terminal) -> None:
    answer = judged.ok("assign", "--planned", "Long=2026-03-09T09:00Z,60h", *TYPED)
    assert "0 of 1 runs served" in answer.out
    assert "run Long: no probe:" in answer.out
    assert "below the accepted odds" in answer.out


def test_a_needed_signal_too_small_serves_nobody(judged: Terminal, tmp_path: Path) -> None:
    lines = [
        "A,2026-03-09T09:00Z,2h,dopamine,triangle,in-vivo,1nM",
        "B,2026-03-09T09:00Z,2h,dopamine,triangle,in-vivo,",
    ]
    found = served(judged.ok("assign", plan(tmp_path, *lines), "--json"))
    assert found["A"] is None
    assert found["B"] is not None


def test_every_fault_of_a_plan_is_told_at_once(judged: Terminal, tmp_path: Path) -> None:
    lines = [
        "A,2026-13-09T09:00Z,2h,dopamine,triangle,in-vivo,",
        "B,2026-03-09T09:00Z,-2h,dopamine,triangle,in-vivo,",
        "C,2026-03-09T09:00Z,2h,,triangle,in-vivo,",
        "D,2026-03-09T09:00Z,2h,dopamine,triangle,in-vivo,5 parsec",
        "E,2026-03-09T09:00Z,2h,dopamine,triangle,in-vivo,",
        "E,2026-03-10T09:00Z,2h,dopamine,triangle,in-vivo,",
    ]
    answer = judged("assign", plan(tmp_path, *lines))
    assert (answer.status, answer.out) == (2, "")
    assert answer.err.startswith("electrolog: 5 faults in the plan")
    for text in (
        "line 2, start: '2026-13",
        "line 3, duration: -2h",
        "line 4, analyte: empty",
        "line 5, needs",
        "'E' stands twice",
    ):
        assert text in answer.err


def test_names_the_record_does_not_know_are_told_per_run(judged: Terminal, tmp_path: Path) -> None:
    lines = ["A,2026-03-09T09:00Z,2h,dopamin,triangle,in-vivo,", "B,2026-03-09T09:00Z,2h,DA,triangle,in-vitro,"]
    answer = judged("assign", plan(tmp_path, *lines))
    assert answer.status == 2
    assert "run 'A': no analyte is called 'dopamin'; the nearest known one is 'dopamine'" in answer.err
    assert "run 'B': no setting is called 'in-vitro'" in answer.err


def test_a_plan_of_other_columns_is_refused(judged: Terminal, tmp_path: Path) -> None:
    assert "nearest known one is 'duration'" in judged.refused("assign", plan(tmp_path, header="label,durations"))
    assert "lacks setting" in judged.refused("assign", plan(tmp_path, header=HEADER.replace(",setting,needs", "")))
    assert "holds 0 runs" in judged.refused("assign", plan(tmp_path))
    assert "which runs?" in judged.refused("assign")
    assert "is no run" in judged.refused("assign", "--planned", "Monday 9 o'clock", *TYPED)


def test_a_run_that_has_begun_is_refused(judged: Terminal) -> None:
    answer = judged("assign", "--planned", "Old=2026-02-01T09:00Z,2h", *TYPED)
    assert answer.status == 2
    assert "accepted: runs to come" in answer.err


def test_without_an_accepted_risk_nothing_is_assigned(judged: Terminal) -> None:
    judged.ok("limits", "unset", "accepted-risk", "--why", "not ours")
    assert "accepted-risk isn't set" in judged.refused("assign", "--planned", "A=2026-03-09T09:00Z,2h", *TYPED)


def test_a_probe_in_use_until_after_the_start_is_not_assigned(judged: Terminal) -> None:
    first = served(judged.ok("assign", "--planned", "A=2026-03-01T09:00Z,2h", *TYPED, "--json"))["A"]
    assert first is not None
    judged.ok("expose", first, "--for", "20h", "-s", "in-vivo", "--start", "10min ago", "--yes")
    assert served(judged.ok("assign", "--planned", "A=2026-03-01T09:00Z,2h", *TYPED, "--json"))["A"] != first


def test_a_probe_lasts_until_the_odds_pass_the_accepted_risk(judged: Terminal) -> None:
    found = judged.ok("outlook", *RUN, "R1", "--json").json
    (lasting,) = found["probes"]
    (alone,) = judged("check", "R1", *RUN, "--json").json
    assert lasting["accepted_h"] * 60 == pytest.approx(alone["longest_run_min"], abs=8)
    low, middle, high = lasting["broken_h"]
    assert low < middle < high
    assert lasting["accepted_h"] <= middle
    assert found["making"] is None


def test_the_date_follows_from_the_pace_of_use(judged: Terminal) -> None:
    found = judged.ok("outlook", *RUN, "--json").json
    assert found["pace_h_per_day"] > 0
    dated = [one for one in found["probes"] if one["accepted_on"] is not None]
    by_odds = [one["electrode"] for one in sorted(dated, key=lambda one: one["accepted_h"])]
    assert by_odds == [
        one["electrode"] for one in sorted(dated, key=lambda one: (one["accepted_on"], one["accepted_h"]))
    ]


def test_more_runs_take_more_probes(judged: Terminal) -> None:
    few, many = (judged.ok("outlook", *RUN, "--runs", runs, "--json").json["making"] for runs in ("5", "200"))
    assert few["to_make"]["enough"] <= many["to_make"]["likely"] <= many["to_make"]["enough"]
    assert many["to_make"]["enough"] > 20
    low, middle, high = many["to_make"]["yield_share"]
    assert 0 < low < middle < high <= 1
    assert "34 usable of 34 made" in many["to_make"]["said"]


def test_probes_of_which_nothing_is_known_are_named_with_the_reason(judged: Terminal) -> None:
    judged.ok("new", "N1,N2")
    assert "can't be told, never calibrated with dopamine and triangle: N1, N2" in judged.ok("outlook", *RUN).out
    assert "accepted: none or more" in judged.refused("outlook", *RUN, "--runs", "-1")


def test_a_probe_rests_between_its_runs(judged: Terminal) -> None:
    for probe in judged.ok("shelf", "--json").json:
        if probe["electrode"] != "R1":
            judged.ok("retire", probe["electrode"], "-r", "broken", "--at", "now")
    day = ("--planned", "A=2026-03-09T09:00Z,1h", "--planned", "B=2026-03-09T11:00Z,1h")
    assert list(served(judged.ok("assign", *day, *TYPED, "--json")).values()) == ["R1", "R1"]
    assert None in served(judged.ok("assign", *day, *TYPED, "--gap", "90min", "--json")).values()
    assert "gap: 'soon' is not a number" in judged.refused("assign", *day, *TYPED, "--gap", "soon")


def test_a_lab_without_probes_serves_nobody(empty: Any) -> None:
    empty.ok("limits", "set", "least-share-left", "50%")
    empty.ok("limits", "adopt", "accepted-risk")
    asked = ("assign", "--planned", "Mon=2099-02-02T09:00Z,2h", "-a", "DA", "-w", "triangle", "-s", "in-vivo")
    (run,) = empty.ok(*asked, "--json").json["runs"]
    assert (run["electrode"], run["why"]) == (None, "no probe: there are none")
