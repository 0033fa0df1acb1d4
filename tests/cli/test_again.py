"""The last entry once more, for another probe."""

from __future__ import annotations

from typing import Any

CALIBRATION = ("calibrate", "B9-01", "pre", "DA", "0:0.1", "0.5uM:6.1", "1uM:12.2", "2uM:24")


def test_a_calibration_is_repeated_with_points_of_its_own(cli: Any) -> None:
    details = ("-w", "triangle", "--standard", "S-48-DA", "--medium", "PBS", "--rig", "north", "--noise", "90pA")
    cli.ok(*CALIBRATION, *details, "--at", "2026-02-01T09:00Z")
    cli.ok("again", "B9-02", "0:0.1", "0.5uM:5.1", "1uM:10.2", "2uM:20", "--at", "2026-02-01T10:00Z")
    (found,) = cli.ok("calibrations", "B9-02", "--json").json
    assert (found["stage"], found["waveform"], found["at"]) == ("pre", "triangle", "2026-02-01T10:00:00Z")
    assert 9.8 < found["sensitivity_na_um"] < 10.2
    from electrolog.lab import open_lab

    row = max(open_lab(cli.db).rows("calibrations"), key=lambda row: row["id"])
    assert (row["standard"], row["medium"], row["rig"], row["noise_na"]) == ("S-48-DA", "PBS", "north", None)
    assert "whose points are each probe's own" in cli.refused("again", "B9-03")


def test_an_event_is_repeated_now_and_a_run_at_its_own_time(cli: Any) -> None:
    cli.ok("clean", "B9-01", "-m", "isopropanol", "--for", "10min", "--at", "2026-02-01T09:00Z")
    cli.ok("again", "B9-02..B9-04", "--at", "2026-02-01T09:30Z")
    assert all("isopropanol" in cli.ok("life", probe).out for probe in ("B9-02", "B9-03", "B9-04"))
    assert "takes no points" in cli.refused("again", "B9-05", "0:0.1")
    run = ("--for", "2h", "-s", "in-vivo", "--subject", "R-1", "--start", "2026-02-02T09:00Z")
    cli.ok("expose", "B9-01", *run)
    cli.ok("again", "B9-02")
    assert "2026-02-02" in cli.ok("life", "B9-02").out


def test_what_was_struck_is_not_repeated_and_nothing_is_said_to_be_so(cli: Any, monkeypatch: Any) -> None:
    cli.ok("clean", "B9-01", "-m", "isopropanol", "--at", "2026-02-01T09:00Z")
    cli.ok("clean", "B9-01", "-m", "acetone", "--at", "2026-02-01T10:00Z")
    number = max(row["id"] for row in _rows(cli, "cleanings"))
    cli.ok("strike", "cleaning", str(number), "--why", "not done")
    cli.ok("again", "B9-02", "--at", "2026-02-01T11:00Z")
    assert _rows(cli, "cleanings")[-1]["method"] == "isopropanol"
    monkeypatch.setattr("getpass.getuser", lambda: "somebody new")
    assert "somebody new has logged nothing yet" in cli.refused("again", "B9-03")


def _rows(cli: Any, sheet: str) -> Any:
    from electrolog.lab import open_lab

    return sorted(open_lab(cli.db).rows(sheet), key=lambda row: row["id"])
