"""Asking back: for a person in sentences and tables, for a program as one JSON document or CSV and nothing else."""

from __future__ import annotations

import csv
import io
import json
from typing import Any

import pytest

# The contract with other programs, "The exchange folder and the machine-readable answers".
CALIBRATION_KEYS = [
    "calibration", "at", "stage", "analyte", "waveform", "sensitivity_na_um", "sensitivity_se_na_um", "intercept_na",
    "intercept_se_na", "residual_sd_na", "r_squared", "n_points", "lod_um", "loq_um", "linear_to_um", "shape",
    "warnings",
]  # fmt: skip
ASKING = {
    "shelf": ("shelf",),
    "shelf of the retired": ("shelf", "--state", "retired"),
    "life": ("life", "B07-01"),
    "history": ("history", "B07-01..B07-03"),
    "calibrations": ("calibrations", "B07-01..B07-03"),
    "words": ("list", "words"),
    "one list of words": ("list", "setting"),
    "analytes": ("list", "analytes"),
    "waveforms": ("list", "waveforms"),
    "batches": ("list", "batches"),
    "standards": ("list", "standards"),
    "limits": ("limits",),
    "journal": ("journal", "--last", "0"),
    "recompute": ("recompute",),
}
JSON_ONLY = {
    "verify": ("verify",),
    "new": ("new", "P1"),
    "coat": ("coat", "B9-01", "-m", "PFSA"),
    "calibrate": ("calibrate", "B9-01", "pre", "DA", "1:2", "-w", "triangle"),
    "standard": ("standard", "S1", "DA", "10mM"),
    "add": ("add", "setting", "brain phantom"),
    "amend": ("amend", "exposure", "1", "note=x", "--why", "y"),
    "strike": ("strike", "exposure", "1", "--why", "y"),
    "setup": ("setup",),
}


def strictly(text: str) -> Any:
    """One JSON document without NaN or Infinity, which JSON does not know."""

    def refuse(name: str) -> None:
        raise AssertionError(f"{name} is no JSON")

    return json.loads(text, parse_constant=refuse)


@pytest.mark.parametrize("arguments", [*ASKING.values(), *JSON_ONLY.values()], ids=[*ASKING, *JSON_ONLY])
def test_json_is_one_document_and_nothing_else(cli: Any, arguments: tuple[str, ...]) -> None:
    answer = cli.ok(*arguments, "--json")
    assert answer.out.isascii()
    assert isinstance(strictly(answer.out), dict | list)


@pytest.mark.parametrize("arguments", ASKING.values(), ids=ASKING)
def test_csv_has_a_header_and_rows_of_one_length(cli: Any, arguments: tuple[str, ...]) -> None:
    text = cli.ok(*arguments, "--csv").out
    rows = list(csv.reader(io.StringIO(text, newline=""), strict=True))
    document = strictly(cli.ok(*arguments, "--json").out)
    known = len(document["events"]) if isinstance(document, dict) else len(document)
    assert len(rows) == (known + 1 if known else len(rows))
    assert len({len(row) for row in rows}) <= 1
    assert "\r\n" in text or not known


@pytest.mark.parametrize("arguments", ASKING.values(), ids=ASKING)
@pytest.mark.parametrize("columns", ["60", "80", "200"])
def test_no_line_is_wider_than_the_terminal(
    cli: Any, monkeypatch: pytest.MonkeyPatch, arguments: tuple[str, ...], columns: str
) -> None:
    monkeypatch.setenv("COLUMNS", columns)
    lines = cli.ok(*arguments).out.splitlines()
    assert lines
    assert [line for line in lines if len(line.rstrip()) > int(columns)] == []


@pytest.mark.parametrize("arguments", ASKING.values(), ids=ASKING)
def test_machine_output_is_the_same_at_any_width(
    cli: Any, monkeypatch: pytest.MonkeyPatch, arguments: tuple[str, ...]
) -> None:
    wide = [cli.ok(*arguments, form).out for form in ("--json", "--csv")]
    monkeypatch.setenv("COLUMNS", "40")
    assert [cli.ok(*arguments, form).out for form in ("--json", "--csv")] == wide


def test_a_note_wider_than_any_terminal_is_not_wrapped_for_a_program(cli: Any) -> None:
    note = "word " * 2000
    cli.ok("note", "B9-01", note)
    assert cli.ok("life", "B9-01", "--json").json["events"][0]["note"] == note
    rows = list(csv.DictReader(io.StringIO(cli.ok("life", "B9-01", "--csv").out, newline="")))
    assert note.strip() in rows[0]["what"]


def test_calibrations_have_the_keys_that_were_promised(cli: Any) -> None:
    found = cli.ok("calibrations", "B07-01", "--json").json
    assert [list(one)[: len(CALIBRATION_KEYS)] for one in found] == [CALIBRATION_KEYS] * 2
    assert [one["calibration"] for one in found] == ["C0042", "C0050"]
    first = found[0]
    assert first["at"] == "2026-01-07T09:00:00Z"
    assert (first["stage"], first["analyte"], first["waveform"]) == ("pre", "dopamine", "triangle")
    assert (first["n_points"], first["shape"], first["warnings"]) == (6, "line", [])
    assert all(isinstance(first[key], float) for key in CALIBRATION_KEYS[5:11])


def test_what_is_unknown_is_null(cli: Any) -> None:
    cli.ok("calibrate", "B9-01", "pre", "DA", "0:1", "0:1", "-w", "triangle", "--yes")
    (found,) = cli.ok("calibrations", "B9-01", "--json").json
    assert found["sensitivity_na_um"] is None
    assert found["lod_um"] is None
    assert found["warnings"]
    assert cli.ok("shelf", "--json").json[-1].keys() == cli.ok("shelf", "--json").json[0].keys()


@pytest.mark.parametrize(
    ("arguments", "found"),
    [
        ((), ["C0042", "C0050"]),
        (("-a", "DA"), ["C0042", "C0050"]),
        (("-a", "Dopamine", "-w", "TRIANGLE"), ["C0042", "C0050"]),
        (("-a", "5-HT"), []),
        (("-w", "serotonin-n"), []),
    ],
)
def test_calibrations_are_chosen_by_analyte_and_waveform(
    cli: Any, arguments: tuple[str, ...], found: list[str]
) -> None:
    for command in ("calibrations", "history"):
        answer = cli.ok(command, "B07-01", *arguments, "--json").json
        assert [one["calibration"] for one in answer] == found


@pytest.mark.parametrize("arguments", [("-a", "gold"), ("-w", "sine"), ("-a", "")])
def test_an_unknown_analyte_is_not_an_empty_answer(cli: Any, arguments: tuple[str, ...]) -> None:
    for command in ("calibrations", "history"):
        cli.refused(command, "B07-01", *arguments)


def test_a_life_is_told_in_the_order_of_time(cli: Any) -> None:
    told = cli.ok("life", "B07-01", "--json").json
    assert told["electrode"]["electrode"] == "B07-01"
    assert (told["electrode"]["batch"], told["electrode"]["made_on"]) == ("B07", "2026-01-05")
    assert told["state"]["name"] == "renewed"
    assert told["state"]["exposure_h"] == {"in-vivo": 24.0}
    times = [event["at"] for event in told["events"]]
    assert times == sorted(times)
    kinds = [event["event"] for event in told["events"]]
    assert kinds == ["coating", "calibration", *["exposure"] * 12, "calibration", "cleaning"]


def test_each_event_of_a_life_can_be_corrected_by_what_is_shown(cli: Any) -> None:
    for event in cli.ok("life", "B07-01", "--json").json["events"]:
        name = event.get("calibration") or str(event["number"])
        cli.ok("amend", event["event"], name, "note=looked at", "--why", "a test")
    assert all(event["note"] == "looked at" for event in cli.ok("life", "B07-01", "--json").json["events"])


def test_history_shows_the_share_left_against_exposure(cli: Any) -> None:
    first, last = cli.ok("history", "B07-01", "--json").json
    assert (first["exposure_h"], first["is_reference"], first["share_left"]) == (0, True, 1.0)
    assert (last["exposure_h"], last["exposure_by_setting_h"]) == (24.0, {"in-vivo": 24.0})
    assert last["share_left"] == pytest.approx(last["sensitivity_na_um"] / first["sensitivity_na_um"])
    assert last["share_left_se"] > 0


@pytest.mark.parametrize(
    ("arguments", "found"),
    [
        ((), 10),
        (("--batch", "b9"), 8),
        (("--batch", "B07"), 2),
        (("--maker", "Wren"), 8),
        (("--coating", "pf"), 1),
        (("--coating", "none"), 9),
        (("--state", "untested"), 8),
        (("--state", "calibrated"), 1),
        (("--state", "renewed"), 1),
        (("--state", "used"), 0),
        (("--state", "retired"), 1),
        (("--state", "usable"), 10),
        (("--analyte", "da"), 2),
        (("--analyte", "5-HT"), 0),
        (("--search", "ISOPROP"), 1),
        (("--search", "nothing of the kind"), 0),
        (("--batch", "B07", "--coating", "none", "--state", "retired"), 1),
    ],
)
def test_the_shelf_is_searched(cli: Any, arguments: tuple[str, ...], found: int) -> None:
    assert len(cli.ok("shelf", *arguments, "--json").json) == found


def test_the_shelf_tells_what_a_probe_is_worth(cli: Any) -> None:
    (own,) = [one for one in cli.ok("shelf", "--json").json if one["electrode"] == "B07-01"]
    assert (own["batch"], own["made_by"], own["coating"]) == ("B07", "finch", "PFSA")
    assert (own["exposure_h"], own["uses"], own["calibrations"]) == (24.0, 12, 2)
    assert own["last_calibration"] == "2026-01-20T09:00:00Z"
    assert 0.6 < own["share_left"] < 0.7
    assert own["age_days"] > 0


@pytest.mark.parametrize(
    "arguments", [("shelf", "--state", "lost"), ("shelf", "--analyte", "gold"), ("list", "nothing")]
)
def test_a_wish_that_cannot_be_met_is_refused(cli: Any, arguments: tuple[str, ...]) -> None:
    cli.refused(*arguments)


def test_the_journal_tells_who_did_what_and_why(cli: Any) -> None:
    cli.ok("amend", "exposure", "1", "duration_min=3h", "--why", "typed wrong")
    (last,) = cli.ok("journal", "--last", "1", "--json").json
    assert (last["action"], last["sheet"], last["row_id"], last["reason"]) == ("amend", "exposures", 1, "typed wrong")
    assert len(cli.ok("journal", "--json").json) == 20
    assert len(cli.ok("journal", "--last", "0", "--json").json) == cli.entries()


def test_verify_says_what_it_found_and_exits_so(cli: Any) -> None:
    import sqlite3
    from contextlib import closing

    assert cli.ok("verify", "--json").json["whole"] is True
    with closing(sqlite3.connect(cli.db)) as connection:
        connection.execute("UPDATE exposures SET duration_min = 1 WHERE id = 3")
        connection.commit()
    answer = cli("verify")
    assert answer.status == 1
    assert "exposure 3: duration_min was changed behind the journal's back" in answer.out
    answer = cli("verify", "--json")
    assert (answer.status, answer.json["whole"], len(answer.json["faults"])) == (1, False, 1)


def test_a_csv_cell_that_looks_like_a_formula_stays_text(cli: Any) -> None:
    cli.ok("add", "analyte", "=1+1", "note=@SUM(A1)", "abbreviation=+x")
    text = cli.ok("list", "analytes", "--csv").out
    (row,) = [row for row in csv.DictReader(io.StringIO(text, newline="")) if "1+1" in row["analyte"]]
    assert (row["analyte"], row["abbreviation"], row["note"]) == ("'=1+1", "'+x", "'@SUM(A1)")
    assert any(one["analyte"] == "=1+1" for one in cli.ok("list", "analytes", "--json").json)
