"""Standards from the balance and the flasks, plans of dilutions, control charts: at the terminal."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import numpy as np
import pytest

MASS = ("--mass", "18.96mg±0.05mg", "--salt", "hydrochloride", "--purity", "98%±1%", "--volume", "10mL±0.02mL")


def stored(cli: Any, label: str) -> Any:
    return next(row for row in cli.ok("list", "standards", "--json").json if row["standard"] == label)


def test_a_standard_from_the_balance_with_its_uncertainty(cli: Any) -> None:
    said = cli.ok("standard", "W", "DA", *MASS).out
    row = stored(cli, "W")
    molar_mass = 153.181 + 36.458
    assert row["concentration_um"] == pytest.approx(18.96 * 0.98 / molar_mass / 0.010 * 1e3)
    shares = np.array([0.05 / 18.96, 0.01 / 0.98, 0.02 / 10]) / np.sqrt(3)
    assert row["relative_uncertainty"] == pytest.approx(float(np.hypot.reduce(shares)), rel=1e-9)
    assert "of its variance: purity" in said
    assert "weighed 18.96mg±0.05mg in 10mL±0.02mL" in row["note"]


def test_a_standard_diluted_from_another(cli: Any) -> None:
    cli.ok("standard", "W", "DA", *MASS)
    steps = ("--dilute", "1mL±0.01mL:10mL±0.02mL", "--dilute", "0.1mL:10mL")
    found = cli.ok("standard", "V", "DA", "--from", "W", *steps, "--json").json[0]
    parent, child = stored(cli, "W"), stored(cli, "V")
    assert child["concentration_um"] == pytest.approx(parent["concentration_um"] / 1000)
    added = np.array([0.01, 0.002]) / np.sqrt(3)
    whole = float(np.hypot.reduce([parent["relative_uncertainty"], *added]))
    assert child["relative_uncertainty"] == pytest.approx(whole, rel=1e-9)
    assert sum(found["uncertainty_budget"].values()) == pytest.approx(1)


def test_the_usual_use_by_is_offered_and_kept_on_request(cli: Any) -> None:
    common = ("--prepared", "2026-01-07T08:00Z", "--diluent", "PBS")
    assert "keeps until" in cli.ok("standard", "A", "DA", "1mM", *common).out
    assert stored(cli, "A")["expires_at"] is None
    cli.ok("standard", "B", "DA", "1mM", *common, "--expires", "usual")
    assert stored(cli, "B")["expires_at"].startswith("2026-01-07T12:00")
    cli.ok(
        "standard", "C", "DA", "1mM", "--prepared", "2026-01-07T08:00Z", "--diluent", "0.1 M acid", "--expires", "usual"
    )
    assert stored(cli, "C")["expires_at"].startswith("2026-01-14T08:00")
    cli.ok("add", "analyte", "novelamine", "molar_mass_g_mol=200")
    assert "no use-by is known" in cli.refused("standard", "D", "novelamine", "1mM", "--expires", "usual")


@pytest.mark.parametrize(
    ("more", "words"),
    [
        ((), "accepted is one of"),
        (("10mM", "--mass", "3mg"), "accepted is one of"),
        (("--mass", "3mg"), "--mass with --volume"),
        (("--mass", "0mg", "--volume", "1mL"), "above zero"),
        (("--mass", "3mL", "--volume", "1mL"), "unit 'mL'"),
        (("--mass", "3mg", "--volume", "1mL", "--purity", "120%"), "at most 1"),
        (("--mass", "3mg", "--volume", "1mL", "--salt", "chloride"), "hydrochloride"),
        (("--mass", "3mg", "--volume", "1mL", "--dilute", "10mL:1mL"), "can't be made up"),
        (("--mass", "3mg", "--volume", "1mL", "--dilute", "10mL"), "is no pair"),
        (("--mass", "3mg", "--volume", "1mL", "--uncertainty", "2%"), "it follows from"),
        (("--from", "S-48-DA"), "--dilute"),
        (("--from", "NONE", "--dilute", "1mL:2mL"), "no standard is called"),
        (("--mass", "3±1±1mg", "--volume", "1mL"), "more than one ±"),
    ],
)
def test_what_gives_no_concentration_is_refused(cli: Any, more: tuple[str, ...], words: str) -> None:
    assert words in cli.refused("standard", "X", "DA", *more)


def test_a_standard_isnt_diluted_into_another_analyte(cli: Any) -> None:
    said = cli.refused("standard", "X", "5-HT", "--from", "S-48-DA", "--dilute", "1mL:2mL")
    assert "holds dopamine" in said


def test_a_plan_of_dilutions_adds_up(cli: Any) -> None:
    plan = cli.ok("dilutions", "S-48-DA", "0.25uM", "2uM", "--volume", "20mL", "--json").json
    assert plan["intermediate"]["source_um"] == 10_000
    for step in plan["steps"]:
        assert step["source_um"] == pytest.approx(plan["intermediate"]["concentration_um"])
        assert step["take_ml"] * step["source_um"] / step["make_up_to_ml"] == pytest.approx(step["concentration_um"])
        assert step["take_ml"] >= 0.01
        assert step["take_ml"] + step["diluent_ml"] == pytest.approx(20)
    assert cli.ok("dilutions", "50uM", "1uM", "--json").json["intermediate"] is None
    assert "can't be made from a stock" in cli.refused("dilutions", "1uM", "2uM")


def check_probe(cli: Any, values: Any, rig: str, probe: str = "B9-01", first: int = 1, standard: str = "") -> None:
    for place, value in enumerate(values):
        points = [f"{c}:{value * c:.5f}" for c in (0, 1, 2)]
        more = ("--standard", standard) if standard else ()
        at = f"2026-02-{first + place:02d}T09:00Z"
        cli.ok("calibrate", probe, "interim", "DA", *points, "-w", "triangle", "--rig", rig, "--at", at, *more)


def test_a_control_chart_per_rig_finds_the_day_a_rig_changed(cli: Any, tmp_path: Path) -> None:
    steady = [12.1, 11.9, 12.0, 12.2, 11.8, 12.1, 11.9, 12.0]
    check_probe(cli, [*steady, 10.4, 10.5, 10.3], "rig-1")
    check_probe(cli, steady, "rig-2", first=12)
    picture = tmp_path / "control.png"
    found = cli.ok("control", "B9-01", "--baseline", "8", "--figure", str(picture), "--json").json
    one, two = found
    assert (one["rig"], two["rig"]) == ("rig-1", "rig-2")
    assert one["centre"] == pytest.approx(12.0)
    mean_range = np.abs(np.diff(steady)).mean()
    assert one["upper"] == pytest.approx(12.0 + 3 * mean_range / 1.128)
    assert one["points"][8]["signals"]
    assert not any(point["signals"] for point in one["points"][:8])
    assert two["in_control"]
    assert picture.read_bytes().startswith(b"\x89PNG")
    said = cli.ok("control", "B9-01", "--rig", "rig-2").out
    assert "in control" in said
    assert "rig-1" not in said


def test_a_check_standard_is_charted_over_several_probes(cli: Any) -> None:
    check_probe(cli, [12.1, 11.9, 12.0], "rig-1", standard="S-48-DA")
    check_probe(cli, [8.1, 7.9, 8.0], "rig-1", "B9-02", 5, standard="S-48-DA")
    check_probe(cli, [30.0], "rig-1", "B9-02", 9)
    (one,) = cli.ok("control", "B9-01", "B9-02", "--standard", "S-48-DA", "--json").json
    assert len(one["points"]) == 6
    assert one["unit"] == "of the probe's own mean"
    assert one["centre"] == pytest.approx(1.0)


def test_what_gives_no_chart_is_refused(cli: Any) -> None:
    check_probe(cli, [12.0, 12.1, 12.2], "rig-1")
    assert "too few" in cli.refused("control", "B9-01", status=1)
    check_probe(cli, [12.0, 12.1], "rig-1", first=5)
    assert "accepted: 4 to 5" in cli.refused("control", "B9-01", "--baseline", "2")
    check_probe(cli, [9.0] * 5, "rig-1", "B9-02")
    assert "all alike" in cli.refused("control", "B9-02", status=1)
    cli.ok("calibrate", "B9-01", "interim", "5-HT", "0:0", "1:5", "2:10", "-w", "serotonin-n", "--rig", "rig-1")
    assert "one analyte and waveform" in cli.refused("control", "B9-01")
    assert cli.ok("control", "B9-01", "-a", "DA", "--json").json[0]["quantity"] == "sensitivity"
