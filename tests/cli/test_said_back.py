"""What is said back in the words of the bench: labels, one point and two points, what a correction did to a figure."""

from __future__ import annotations

from typing import Any

import pytest

NOW = ("--at", "2026-02-02T10:00Z")


def test_a_corrected_point_says_the_new_sensitivity(cli: Any) -> None:
    out = cli.ok("amend", "point", "C0042/5", "current_na=12.8", "--why", "misread").out
    assert "point C0042/5: current was 12.2 nA, is 12.8 nA" in out
    before, after = out.splitlines()[1].split(", is ")
    assert before.startswith("  C0042: sensitivity was 11.927 ± ")
    assert after.endswith(" nA/µM")
    told = cli.ok("amend", "calibration", "C0043", "noise_na=0.2", "--why", "measured", "--json").json
    assert told["sensitivities"] == {}  # the noise moves the detection limit alone


def test_a_struck_points_calibration_says_its_new_sensitivity(cli: Any) -> None:
    told = cli.ok("strike", "point", "C0042/5", "--why", "bubble", "--json").json
    ((before, _), (after, _)) = told["sensitivities"]["C0042"]
    (found,) = (one for one in cli.ok("calibrations", "B07-01", "--json").json if one["calibration"] == "C0042")
    assert (before != after, after) == (True, found["sensitivity_na_um"])


def test_the_journal_names_rows_as_people_do(cli: Any) -> None:
    cli.ok("amend", "point", "C0042/5", "current_na=12.8", "--why", "misread")
    cli.ok("strike", "exposure", "1", "--why", "never happened")
    cli.ok("add", "medium", "brain phantom")
    told = cli.ok("journal", "--last", "0", "--json").json
    names = [one["what"] for one in told]
    assert names[-3:] == ["amend point C0042/5", "strike exposure 1 of B07-01", "add word 1"]
    assert {"add probe B9-01", "add batch B9", "add standard S-48-DA", "add calibration C0042"} <= set(names)
    assert "add cleaning 1 of B07-01" in names
    out = cli.ok("journal", "--last", "3").out
    assert "point C0042/5" in out


@pytest.mark.parametrize("command", ["calibrations", "history", "life"])
def test_an_empty_list_has_its_columns_in_csv(cli: Any, command: str) -> None:
    cli.ok("new", "Z-1")
    filled = cli.ok(command, "B07-01", "--csv").out.splitlines()[0]
    assert cli.ok(command, "Z-1", "--csv").out.splitlines() == [filled]


def test_an_empty_shelf_has_its_columns_in_csv(cli: Any) -> None:
    filled = cli.ok("shelf", "--csv").out.splitlines()[0]
    assert cli.ok("shelf", "--batch", "B9", "--coating", "PEDOT", "--csv").out.splitlines() == [filled]


def test_a_remark_and_an_inspection_may_be_of_one_moment(cli: Any) -> None:
    cli.ok("inspect", "B9-01", "--noise", "80pA", *NOW)
    cli.ok("note", "B9-01", "tip looks bent", *NOW)
    cli.ok("note", "B9-01", "or is it the lens", *NOW)
    assert [line.split()[0] for line in cli.ok("life", "B9-01").out.splitlines()].count("2026-02-02") == 3
    cli.ok("note", "B9-02", "first", *NOW)
    cli.ok("inspect", "B9-02", "--seal", "yes", *NOW)
    assert "is there already" in cli.refused("inspect", "B9-01", "--noise", "90pA", *NOW)


def test_one_is_said_in_the_singular(cli: Any) -> None:
    out = cli.ok("calibrate", "B9-03", "pre", "DA", "1:12", "-w", "triangle").out
    assert "(line-through-zero, 1 point)" in out
    assert "  1 point\n" in cli.ok("journal", "--last", "1").out
    cli.ok("expose", "B9-03", "--for", "2h", "-s", "in-vivo", "--start", "2026-02-02T10:00Z")
    assert "; 1 use\n" in cli.ok("life", "B9-03").out


def test_a_word_that_a_column_doesnt_take_is_named_with_those_it_takes(cli: Any) -> None:
    assert "seal_ok: found 'maybe'; accepted: yes, no" in cli.refused("inspect", "B9-01", "--seal", "maybe")


def test_zeros_are_no_certain_sensitivity(cli: Any) -> None:
    out = cli.ok("calibrate", "B9-04", "pre", "DA", "0:0", "1:0", "2:0", "-w", "triangle").out
    assert "sensitivity 0 ± ? nA/µM (line, 3 points)" in out
    assert "interval" not in out
    assert "every current is 0 nA, whatever the concentration: no response was measured" in " ".join(out.split())
    assert out.count("!") == 1
