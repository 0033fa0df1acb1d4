"""Logging at the bench: one line each, values as people type them, all of an entry or none."""

from __future__ import annotations

from datetime import UTC, datetime, timedelta
from pathlib import Path
from typing import Any

import pytest


def events(cli: Any, probe: str) -> list[dict[str, Any]]:
    found: list[dict[str, Any]] = cli.ok("life", probe, "--json").json["events"]
    return found


@pytest.mark.parametrize(
    ("named", "logged"),
    [
        (["B9-01"], 1),
        (["b9-01"], 1),
        (["B9-01..B9-08"], 8),
        (["B9-01..03"], 3),
        (["B9-01,B9-04"], 2),
        (["B9-01, B9-04", "B9-05"], 3),
        (["B9-01..B9-03,B9-08", "B9-02"], 4),
        (["B9-01,b9-01", "B9-01"], 1),
    ],
)
def test_several_probes_are_logged_in_one_line(cli: Any, named: list[str], logged: int) -> None:
    entered = cli.ok("clean", *named, "-m", "isopropanol", "--json").json
    assert len(entered) == logged
    assert all(len(events(cli, one["electrode"])) == 1 for one in entered)
    assert {one["electrode"] for one in entered} <= {f"B9-{number:02d}" for number in range(1, 9)}


@pytest.mark.parametrize("named", ["B9-03..B9-01", "B9-..", "..", "B9-01..X-03", "B9-01,,B9-02", "B9-01..B9-99999"])
def test_a_range_that_makes_no_sense_is_refused(cli: Any, named: str) -> None:
    assert "accepted:" in cli.refused("clean", named, "-m", "isopropanol")


def test_a_range_over_a_gap_logs_nothing(cli: Any) -> None:
    assert "'B9-09'" in cli.refused("clean", "B9-07..B9-10", "-m", "isopropanol")


@pytest.mark.parametrize(
    ("arguments", "expected"),
    [
        (("coat", "-m", "pfsa", "--potential", "\u2212400mV", "--for", "2min", "--bath", "5%"), (-0.4, 120.0, 5.0)),
        (("coat", "-m", "PFSA", "--potential=-0.4 V", "--for", "120", "--bath", "5"), (-0.4, 120.0, 5.0)),
    ],
)
def test_a_coating_is_taken_as_typed(cli: Any, arguments: tuple[str, ...], expected: tuple[float, ...]) -> None:
    (entered,) = cli.ok(arguments[0], "B9-01", *arguments[1:], "--json").json
    assert (entered["potential_v"], entered["duration_s"], entered["concentration_wt_pct"]) == expected
    assert entered["material"] == "PFSA"


@pytest.mark.parametrize("typed", ["500nM", "0.5uM", "0.5 \u00b5M", "0.5\u03bcM", "0.5", "5e-1", "0.0005mM"])
def test_a_concentration_is_taken_as_typed(cli: Any, typed: str) -> None:
    answer = cli.ok(
        "calibrate", "B9-01", "pre", "da", "0:0.1", f"{typed}:6100pA", "1uM:12.2", "-w", "Triangle", "--json"
    )
    assert answer.json["points"][1] == {"concentration_um": 0.5, "current_na": 6.1}
    assert (answer.json["analyte"], answer.json["waveform"]) == ("dopamine", "triangle")


@pytest.mark.parametrize("typed", ["4h", "240", "240min", "3h60", "0.1d96min", "14400s"])
def test_a_duration_is_taken_as_typed(cli: Any, typed: str) -> None:
    (entered,) = cli.ok("expose", "B9-01", "--for", typed, "-s", "in-vivo", "--json").json
    assert entered["duration_min"] == pytest.approx(240)


def test_replicates_share_their_concentration(cli: Any) -> None:
    answer = cli.ok(
        "calibrate", "B9-01", "pre", "DA", "0:0.1,0.12", "500nM:6.1", "0.5uM:6.3", "1uM:12.2", "-w", "triangle"
    )
    assert "5 points" in answer.out
    points = cli.ok("calibrations", "B9-01", "--json").json[0]["points"]
    assert [point["concentration_um"] for point in points] == [0, 0, 0.5, 0.5, 1]


def test_the_answer_says_what_was_computed(cli: Any) -> None:
    answer = cli.ok(
        "calibrate", "B9-01", "pre", "DA", "0:0", "1:10", "2:20.1", "3:29.9", "-w", "triangle", "--noise", "80pA"
    )
    assert "sensitivity 9.980 ±" in answer.out
    assert "detection limit" in answer.out
    cli.ok("calibrate", "B9-01", "post", "DA", "0:0", "1:8", "2:16.1", "3:23.9", "--yes")
    assert "share left 79.96 " in " ".join(cli.ok("calibrations", "B9-01").out.split())


def test_the_waveform_is_the_one_used_last(cli: Any) -> None:
    assert (
        cli.ok("calibrate", "B07-01", "interim", "DA", "0:0.1", "1:8.1", "2:16.2", "--json").json["waveform"]
        == "triangle"
    )
    assert "was never calibrated with DA" in cli.refused("calibrate", "B9-01", "pre", "DA", "0:0.1", "1:8.1", "2:16.2")


def test_an_old_factor_alone_is_taken(cli: Any) -> None:
    answer = cli.ok(
        "calibrate", "B9-01", "pre", "DA", "--factor", "12.4nA/uM", "--factor-se", "0.3", "-w", "triangle", "--json"
    )
    assert (answer.json["sensitivity_na_um"], answer.json["sensitivity_se_na_um"], answer.json["n_points"]) == (
        12.4,
        0.3,
        0,
    )


def test_points_come_from_a_file(cli: Any, tmp_path: Path) -> None:
    (tmp_path / "p.csv").write_text("current_na,concentration_um\n0.1,0\n6.1,0.5\n12.2,1\n", encoding="utf-8-sig")
    answer = cli.ok("calibrate", "B9-01", "pre", "DA", "--points", "p.csv", "-w", "triangle", "--json")
    assert answer.json["points"] == [
        {"concentration_um": c, "current_na": i} for c, i in ((0, 0.1), (0.5, 6.1), (1, 12.2))
    ]


def test_one_file_holds_several_probes(cli: Any, tmp_path: Path) -> None:
    rows = [f"{probe},{c},{12 * c + 0.1}" for probe in ("B9-01", "b9-02") for c in (0, 0.5, 1)]
    text = "\n".join(["electrode,concentration_um,current_na", *rows]) + "\n"
    (tmp_path / "p.csv").write_text(text, encoding="utf-8")
    made = cli.ok("calibrate", "-", "pre", "DA", "--points", "p.csv", "-w", "triangle", "--json").json
    assert [one["electrode"] for one in made] == ["B9-01", "B9-02"]
    assert len({one["calibration"] for one in made}) == 2
    assert "names its electrodes itself" in cli.refused(
        "calibrate", "B9-01", "pre", "DA", "--points", "p.csv", "-w", "triangle"
    )


@pytest.mark.parametrize(
    ("content", "said"),
    [
        (b"", "has no column"),
        (b"concentration_um,current_na\n", "holds no points"),
        (b"concentration_um;current_na\n0;1\n", "has no column"),
        (b"\xff\xfe\x00bad", "not text in UTF-8"),
        (b"concentration_um,current_na\n0,\xb5\n", "not text in UTF-8"),
        (b'concentration_um,current_na\n0,"1\n', "can't be read"),
        (b"electrode,concentration_um,current_na\nB9-01,0,1\n,1,2\n", "name no electrode"),
        (b"electrode,concentration_um,current_na\nB9-01,0,1\nB9-77,1,2\n", "no probe is called 'B9-77'"),
    ],
)
def test_a_file_that_cannot_be_read_is_refused(cli: Any, tmp_path: Path, content: bytes, said: str) -> None:
    (tmp_path / "p.csv").write_bytes(content)
    assert said in cli.refused("calibrate", "-", "pre", "DA", "--points", "p.csv", "-w", "triangle")


def test_every_bad_row_of_a_file_is_named_at_once(cli: Any, tmp_path: Path) -> None:
    rows = "0,0.1", "1", "2,24,5", "x,3", "-1,3", '3,"36,5"', "4,48"
    (tmp_path / "p.csv").write_text("\n".join(["concentration_um,current_na", *rows]), encoding="utf-8")
    answer = cli("calibrate", "B9-01", "pre", "DA", "--points", "p.csv", "-w", "triangle")
    assert answer.status == 2
    first, *faults = answer.err.splitlines()
    assert "5 rows can't be taken; nothing was written" in first
    assert [fault.split(":")[0].strip() for fault in faults] == [f"p.csv line {number}" for number in (3, 4, 5, 6, 7)]
    assert events(cli, "B9-01") == []


def test_a_missing_file_is_named(cli: Any) -> None:
    assert "nope.csv" in cli.refused("calibrate", "B9-01", "pre", "DA", "--points", "nope.csv", "-w", "triangle")


def test_times_are_now_unless_said(cli: Any) -> None:
    cli.ok("clean", "B9-01", "-m", "acetone")
    cli.ok("expose", "B9-02", "--for", "4h", "-s", "slice")
    now = datetime.now(UTC)
    cleaned, began = (datetime.fromisoformat(events(cli, probe)[0]["at"]) for probe in ("B9-01", "B9-02"))
    assert abs(now - cleaned) < timedelta(minutes=1)
    assert abs(now - timedelta(hours=4) - began) < timedelta(minutes=1)


@pytest.mark.parametrize(
    ("typed", "utc"),
    [
        ("2026-03-14T14:30", "2026-03-14T14:30:00Z"),
        ("2026-07-14 14:30", "2026-07-14T13:30:00Z"),
        ("2026-07-14T14:30+05:00", "2026-07-14T09:30:00Z"),
    ],
)
def test_times_are_read_in_the_zone_named(cli: Any, typed: str, utc: str) -> None:
    cli.ok("--zone", "Europe/Lisbon", "clean", "B9-01", "-m", "acetone", "--at", typed)
    assert events(cli, "B9-01")[0]["at"] == utc


@pytest.mark.parametrize(
    "arguments",
    [
        ("new", "B9-01"),
        ("new", "--batch", "B9", "--count", "0"),
        ("new", "P1", "--count", "2"),
        ("new",),
        ("new", ""),
        ("new", "P1", "--geometry", "ball"),
        ("new", "P1", "--length", "-5um"),
        ("new", "--batch", "N", "--count", "2", "--made-on", "2026-02-30"),
        ("new", "--batch", "N", "--count", "2", "--fibre", "steel"),
        ("coat", "B9-01", "-m", "paint"),
        ("coat", "B9-01", "-m", "PFSA", "--layers", "2.5"),
        ("coat", "B9-01", "-m", "PFSA", "--at", "yesterday"),
        ("coat", "B9-01"),
        ("condition", "B9-01", "-w", "sine"),
        ("expose", "B9-01", "--for", "0", "-s", "in-vivo"),
        ("expose", "B9-01", "--for", "-4h", "-s", "in-vivo"),
        ("expose", "B9-01", "--for", "99999999d", "-s", "in-vivo"),
        ("expose", "B9-01", "--for", "soon", "-s", "in-vivo"),
        ("expose", "B9-01", "--for", "4h", "-s", "dish"),
        ("clean", "B9-01", "-m", "soap"),
        ("clean", "-m", "acetone"),
        ("recut", "B9-01", "--length", "0"),
        ("inspect", "B9-01", "--seal", "maybe"),
        ("note", "B9-01", ""),
        ("note", "B9-01", "  "),
        ("note", "B9-01"),
        ("retire", "B9-01", "-r", "boredom"),
        ("retire", "B07-02", "-r", "broken", "--yes"),
        ("standard", "S1", "DA", "0"),
        ("standard", "S1", "DA", "10mM", "--uncertainty", "150%"),
        ("standard", "S1", "DA", "10mM", "--prepared", "2026-01-02T10:00Z", "--expires", "2026-01-01T10:00Z"),
        ("standard", "S-48-DA", "DA", "10mM"),
        ("add", "setting", "in-vivo"),
        ("add", "colour", "red"),
        ("add", "waveform", "x", "vertices_v=1", "scan_rate_v_s=400", "frequency_hz=10"),
        ("add", "waveform", "x", "vertices_v"),
        ("add", "analyte", "DOPAMINE"),
        ("calibrate", "B9-01", "pre", "DA"),
        ("calibrate", "B9-01", "before", "DA", "0:1", "1:2", "-w", "triangle"),
        ("calibrate", "B9-01", "pre", "gold", "0:1", "1:2", "-w", "triangle"),
        ("calibrate", "B9-01", "pre", "DA", "0:1", "1:", "-w", "triangle"),
        ("calibrate", "B9-01", "pre", "DA", "0:1", "1", "-w", "triangle"),
        ("calibrate", "B9-01", "pre", "DA", "0:1", "1:1,", "-w", "triangle"),
        ("calibrate", "B9-01", "pre", "DA", "0:1", "1nA:1", "-w", "triangle"),
        ("calibrate", "B9-01", "pre", "DA", "0:1", "1:1uM", "-w", "triangle"),
        ("calibrate", "B9-01", "pre", "DA", "0:1", "1:nan", "-w", "triangle"),
        ("calibrate", "B9-01", "pre", "DA", "0:1", "1:1e300", "-w", "triangle"),
        ("calibrate", "B9-01,B9-02", "pre", "DA", "0:1", "1:2", "-w", "triangle"),
        ("calibrate", "B9-01", "pre", "DA", "0:1", "1:2", "--factor", "12", "-w", "triangle"),
        ("calibrate", "B9-01", "pre", "DA", "0:1", "1:2", "--label", "C0042", "-w", "triangle"),
    ],
    ids=" ".join,
)
def test_what_cannot_be_is_refused_in_one_line(cli: Any, arguments: tuple[str, ...]) -> None:
    cli.refused(*arguments)
