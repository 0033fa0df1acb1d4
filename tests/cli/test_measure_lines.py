"""What the line of a calibration is asked at the terminal: weights, detection, an unknown, its health, recompute."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import numpy as np
import pytest

from electrolog.measure.inverse import predict_concentration
from electrolog.measure.line import fit_line
from electrolog.measure.weights import from_concentration

POINTS = ("0:0.1,0.3,-0.1", "0.25uM:3.2,3.1", "0.5uM:6.1,6.3", "1uM:12.2,11.7", "2uM:24.0,25.1")
X = np.repeat([0, 0.25, 0.5, 1, 2], [3, 2, 2, 2, 2])
Y = np.array([0.1, 0.3, -0.1, 3.2, 3.1, 6.1, 6.3, 12.2, 11.7, 24.0, 25.1])


def logged(cli: Any, *more: str) -> Any:
    args = ("calibrate", "B9-01", "pre", "DA", *POINTS, "-w", "triangle", "--label", "K1", "--at", "2026-01-07T09:00Z")
    return cli.ok(*args, *more, "--json").json


def known(cli: Any) -> Any:
    return cli.ok("calibrations", "B9-01", "--json").json[0]


def test_chosen_weights_are_kept_and_recompute_follows_them(cli: Any) -> None:
    one = logged(cli, "--weights", "1/x2")
    line = fit_line(X, Y, weights=from_concentration(X, 2))
    assert one["sensitivity_na_um"] == pytest.approx(line.slope_na_um, rel=1e-12)
    assert one["weighting"] == "1/x2"
    assert "nothing changed" in cli.ok("recompute").out
    assert known(cli)["sensitivity_na_um"] == one["sensitivity_na_um"]


def test_weights_are_amended_like_a_column_and_a_new_note_leaves_them(cli: Any) -> None:
    logged(cli, "--note", "tip clean")
    plain = known(cli)["sensitivity_na_um"]
    said = cli.ok("amend", "calibration", "K1", "weights=1/x", "--why", "scatter grows").out
    assert "weights was equal, is 1/x" in said
    weighted = known(cli)["sensitivity_na_um"]
    assert weighted == pytest.approx(fit_line(X, Y, weights=from_concentration(X, 1)).slope_na_um, rel=1e-12)
    cli.ok("amend", "calibration", "K1", "note=tip bent", "--why", "looked again")
    assert known(cli)["weighting"] == "1/x"
    assert "note tip bent" in cli.ok("life", "B9-01").out
    cli.ok("amend", "calibration", "K1", "through_zero=yes", "--why", "blank subtracted")
    assert known(cli)["shape"] == "line-through-zero"
    cli.ok("amend", "calibration", "K1", "weights=", "through_zero=no", "--why", "as it was")
    assert known(cli)["sensitivity_na_um"] == plain
    assert "accepted" in cli.refused("amend", "calibration", "K1", "weights=heavy", "--why", "x")


def test_weights_that_a_later_correction_makes_impossible_are_said(cli: Any) -> None:
    logged(cli, "--weights", "replicates")
    cli.ok("strike", "point", "K1/5", "--why", "bubble")
    one = known(cli)
    assert one["weighting"] is None
    assert any("weights by replicates can't be had" in text for text in one["warnings"])


def test_a_handling_that_cant_be_read_is_said_and_lost_nowhere(cli: Any) -> None:
    logged(cli)
    cli.ok("amend", "calibration", "K1", 'note=handling: {"weights": "heavy"}', "--why", "by hand")
    one = known(cli)
    assert any("handling can't be read" in text for text in one["warnings"])
    assert one["weighting"] is None


def test_detection_by_every_route_or_why_not(cli: Any) -> None:
    logged(cli, "--noise", "80pA")
    found = cli.ok("calibrations", "B9-01", "--detection", "--json").json[0]["detection"]
    by_route = {one["route"]: one for one in found}
    assert len(by_route) == 7
    slope = fit_line(X, Y).slope_na_um
    assert by_route["3 × the signal's noise / sensitivity"]["lod_um"] == pytest.approx(0.24 / slope)
    assert by_route["IUPAC 1995 (Currie), the signal's noise"]["lod_um"] == pytest.approx(3.29 * 0.08 / slope, rel=1e-3)
    blanks = np.std([0.1, 0.3, -0.1], ddof=1)
    assert by_route["3 × standard deviation of the 3 blanks / sensitivity"]["lod_um"] == pytest.approx(
        3 * blanks / slope
    )
    assert by_route["ISO 11843-2"]["lod_um"] > by_route["ISO 11843-2"]["critical_um"] > 0
    said = cli.ok("calibrations", "B07-01", "--detection").out
    assert "not by the" in said or "not by 3 ×" in said
    assert "no noise was measured" in said


def test_an_unknown_is_read_off_with_its_interval(cli: Any) -> None:
    logged(cli)
    found = cli.ok("concentration", "K1", "7.7nA,7.9", "--json").json
    own = predict_concentration(fit_line(X, Y), 7.8, 2)
    assert found["prediction"]["concentration_um"] == pytest.approx(own.concentration_um)
    assert found["prediction"]["fieller_um"] == pytest.approx(list(own.fieller_um or ()))
    assert "(Fieller)" in cli.ok("concentration", "K1", "7.7nA").out
    assert "outside what was calibrated" in cli.ok("concentration", "K1", "80nA").out
    assert "calibration is called 'K9'" in cli.refused("concentration", "K9", "5nA")
    wide, narrow = (
        cli.ok("concentration", "K1", "7.7nA", "--confidence", share, "--json").json["prediction"]["delta_um"]
        for share in ("99%", "0.9")
    )
    assert wide[0] < narrow[0] < narrow[1] < wide[1]
    assert "above 0 and below 1" in cli.refused("concentration", "K1", "5nA", "--confidence", "100%")


def test_of_a_reference_without_response_nothing_is_a_share(cli: Any) -> None:
    flat = ("0:0.1,0.2,-0.1", "1uM:0.15", "2uM:0.05,0.3")
    cli.ok("calibrate", "B9-01", "pre", "DA", *flat, "-w", "triangle", "--at", "2026-01-07T09:00Z", "--yes")
    cli.ok("calibrate", "B9-01", "interim", "DA", *POINTS, "-w", "triangle", "--at", "2026-01-07T10:00Z", "--yes")
    said = cli.ok("calibrations", "B9-01", "--json").json
    assert [one["share_left"] for one in said] == [None, None]
    assert "share left ? of the reference" in cli.ok("calibrations", "B9-01").out


def test_a_standards_uncertainty_is_carried_in_however_its_label_is_typed(cli: Any) -> None:
    at = ("-w", "triangle", "--at", "2026-01-07T09:00Z", "--standard", "s-48-da")
    shared = cli.ok("calibrate", "B9-01", "pre", "DA", *POINTS, *at, "--json").json["sensitivity_se_shared_na_um"]
    assert shared == pytest.approx(0.02 * 12.1, rel=0.03)
    assert cli.ok("recompute", "--json").json == []
    assert cli.ok("recompute", "--csv").out.startswith("calibration,")


def test_an_unknown_has_no_interval_where_the_slope_says_nothing(cli: Any) -> None:
    flat = ("0:5", "0.5uM:5.3", "1uM:4.9", "2uM:5.2")
    cli.ok("calibrate", "B9-01", "pre", "DA", *flat, "-w", "triangle", "--label", "K2", "--yes")
    said = cli.ok("concentration", "K2", "5nA").out
    assert "no concentration" in said
    assert "can't be told from zero" in said


def test_a_levelling_calibration_isnt_read_backwards(cli: Any) -> None:
    bent = [f"{c}uM:{60 * c / (1 + c):.4g},{60 * c / (1 + c) + 0.2:.4g}" for c in (0.1, 0.5, 1, 2, 5, 10)]
    cli.ok("calibrate", "B9-01", "pre", "DA", *bent, "-w", "triangle", "--label", "K3")
    assert "levels off" in cli.refused("concentration", "K3", "20nA", status=1)


def test_sensitivity_per_length_and_per_area(cli: Any) -> None:
    cli.ok("new", "L-1", "--geometry", "cylinder", "--length", "75um", "--diameter", "7um")
    cli.ok("calibrate", "L-1", "pre", "DA", *POINTS, "-w", "triangle", "--at", "2026-01-07T09:00Z")
    first = cli.ok("calibrations", "L-1", "--json").json[0]
    per = {one["unit"]: one["value"] for one in first["specific"]}
    assert per["pA/(µM·µm)"] == pytest.approx(1000 * first["sensitivity_na_um"] / 75)
    area = np.pi * 7 * 75 + np.pi * 7**2 / 4
    assert per["pA/(µM·µm²)"] == pytest.approx(1000 * first["sensitivity_na_um"] / area)
    cli.ok("recut", "L-1", "--length", "50um", "--at", "2026-01-08T09:00Z")
    cli.ok("calibrate", "L-1", "pre", "DA", *POINTS, "-w", "triangle", "--at", "2026-01-09T09:00Z")
    second = cli.ok("calibrations", "L-1", "--json").json[1]
    per = {one["unit"]: one["value"] for one in second["specific"]}
    assert per["pA/(µM·µm)"] == pytest.approx(1000 * second["sensitivity_na_um"] / 50)


def test_a_range_that_misses_the_expected_signal_is_said(cli: Any) -> None:
    assert "is expected" in cli.ok("calibrations", "B07-01", "--expecting", "50nM-5uM").out
    assert "is expected" not in cli.ok("calibrations", "B07-02", "--expecting", "0.3uM-1uM").out
    assert "lowest and highest" in cli.refused("calibrations", "B07-01", "--expecting", "5uM")
    unseen = "the expected signal begins at 0.001 µM, below the detection limit"
    assert unseen in " ".join(cli.ok("calibrations", "B07-02", "--expecting", "1nM-1uM").out.split())


@pytest.mark.parametrize(
    ("more", "words"),
    [
        (("--temperature", "25C"), "measured at 25 °C"),
        (("--medium", "tris buffer"), "measured in tris buffer"),
        (("--noise", "0.3nA"), "noise is 3 times"),
        (("--background", "600nA"), "background current changed by +50%"),
        (("--oxidation", "0.70V", "--reduction", "-0.12V"), "the reference electrode drifted"),
        (("--oxidation", "0.70V", "--reduction", "-0.28V"), "farther apart"),
        (("--standard", "OLD"), "old; dopamine in PBS keeps 4 h"),
        (("--standard", "GONE"), "after it expired"),
    ],
)
def test_what_changed_since_the_last_calibration_is_said(cli: Any, more: tuple[str, ...], words: str) -> None:
    cli.ok("standard", "OLD", "DA", "1mM", "--diluent", "PBS", "--prepared", "2026-01-01T08:00Z")
    gone = ("--prepared", "2026-01-01T08:00Z", "--expires", "2026-01-01T12:00Z")
    cli.ok("standard", "GONE", "DA", "1mM", *gone)
    logged(cli, "--temperature", "37C", "--medium", "PBS", "--noise", "0.1nA", "--background", "400nA",
           "--oxidation", "0.62V", "--reduction", "-0.2V")  # fmt: skip
    args = ("calibrate", "B9-01", "interim", "DA", *POINTS, "--at", "2026-01-08T09:00Z")
    assert not cli.ok(*args, "--json").json["warnings"]
    said = cli.ok(*args, *more, "--at", "2026-01-09T09:00Z", "--json").json["warnings"]
    assert [text for text in said if words in text]


def day(cli: Any, at: str, factor: float, *more: str) -> None:
    for place in range(4):
        points = [
            f"{c}:{(10 + place) * factor * c + 0.01 * ((7 * place + round(4 * c)) % 3):.4f}" for c in (0, 0.5, 1, 2)
        ]
        cli.ok("calibrate", f"B9-0{place + 1}", "interim", "DA", *points, "-w", "triangle", "--at", at, *more)


def test_a_shift_that_all_probes_of_a_day_share_points_at_the_standard(cli: Any) -> None:
    cli.ok("standard", "NEW", "DA", "1mM", "--prepared", "2026-01-08T08:00Z")
    day(cli, "2026-01-07T09:00Z", 1.0, "--rig", "rig-1")
    day(cli, "2026-01-08T09:00Z", 1.3, "--standard", "NEW", "--rig", "rig-1")
    said = cli.ok("calibrations", "B9-02", "--json").json
    shared = [text for text in said[1]["warnings"] if "all 4 probes" in text]
    assert len(shared) == 1
    assert "standard NEW or rig rig-1" in shared[0]
    assert not [text for text in said[0]["warnings"] if "all 4 probes" in text]


def test_probes_that_were_used_in_between_say_nothing_of_the_standard(cli: Any) -> None:
    cli.ok("standard", "NEW", "DA", "1mM", "--prepared", "2026-01-08T08:00Z")
    day(cli, "2026-01-07T09:00Z", 1.0)
    for place in range(2):
        run = ("--for", "2h", "-s", "in-vivo", "--start", "2026-01-07T12:00Z")
        cli.ok("expose", f"B9-0{place + 1}", *run)
    day(cli, "2026-01-08T09:00Z", 0.7, "--standard", "NEW")
    said = cli.ok("calibrations", "B9-02", "--json").json[1]["warnings"]
    assert not [text for text in said if "that points at" in text]


def test_recompute_lists_what_a_correction_behind_it_changed(cli: Any) -> None:
    from electrolog.record import queries
    from electrolog.record.store import open_record

    logged(cli)
    record = open_record(cli.db)
    with record.writing() as writer:
        found = next(one for one in queries.calibrations(writer.connection) if one.row["calibration"] == "K1")
        older = {**dict(found.figures or {}), "method": "line-0", "sensitivity_na_um": 11.0}
        queries.keep_figures(writer, {found.row["id"]: ("line-0", older)})
    said = cli.ok("recompute", "--json").json
    assert [one["calibration"] for one in said] == ["K1"]
    assert said[0]["changes"]["sensitivity_na_um"] == [11.0, pytest.approx(12.2, abs=0.3)]
    assert said[0]["changes"]["method"][0] == "line-0"
    assert "nothing changed" in cli.ok("recompute").out


@pytest.mark.parametrize("name", ["line.bmp", "line", "nowhere/line.png"])
def test_a_picture_that_cant_be_drawn_is_refused_before_the_calibration_is_logged(cli: Any, name: str) -> None:
    said = cli.refused("calibrate", "B9-01", "pre", "DA", *POINTS, "-w", "triangle", "--figure", name)
    assert said.startswith("electrolog: figure: ")


def test_the_line_is_drawn(cli: Any, tmp_path: Path) -> None:
    picture = tmp_path / "line.png"
    logged(cli, "--figure", str(picture))
    assert picture.read_bytes().startswith(b"\x89PNG")
    many = tmp_path / "many.svg"
    cli.ok("calibrations", "B07-01..B07-03", "--figure", str(many))
    assert "C0042" in many.read_text(encoding="utf-8")
