"""A methods paragraph whose every number can be found again in the record; a dictionary of all its columns."""

from __future__ import annotations

import csv
import io
import statistics
from typing import Any

import pytest

from electrolog.record.sheets import SHEETS


def test_the_paragraph_says_what_the_record_holds(cli: Any) -> None:
    out = " ".join(cli.ok("methods", "B07-01..B07-03", "--analyte", "DA").out.split())
    assert "3 carbon-fibre microelectrodes from 1 batch were calibrated for dopamine." in out
    assert "Coating: none (2), PFSA (1)." in out
    assert "vertices -0.4 1.3 -0.4 V at 400 V/s, 10 Hz" in out
    assert "There were 4 calibrations (3 pre, 1 post); medium: not recorded" in out
    assert "12 runs (in-vivo) lasted 120 min." in out
    assert "Retired probes are included: broken." in out
    assert "No calibration was left out." in out


def test_its_numbers_are_those_of_the_calibrations(cli: Any) -> None:
    told = cli.ok("methods", "B07-01", "B07-02", "B07-03", "-a", "DA", "--json").json
    found = [one for label in ("B07-01", "B07-02", "B07-03") for one in cli.ok("calibrations", label, "--json").json]
    pre = [one["sensitivity_na_um"] for one in found if one["stage"] == "pre"]
    assert told["sensitivity_na_um"]["pre"]["n"] == len(pre)
    assert told["sensitivity_na_um"]["pre"]["mean"] == pytest.approx(statistics.fmean(pre), rel=1e-12)
    assert told["sensitivity_na_um"]["pre"]["sd"] == pytest.approx(statistics.stdev(pre), abs=1e-9)
    assert told["sensitivity_na_um"]["post"]["sd"] is None
    assert told["lod_um"]["most"] == max(one["lod_um"] for one in found)
    # the first run began 2026-01-08 at 09:00, a day after the calibration at 09:00; the twelfth eleven days later
    assert (told["hours_to_run"]["least"], told["hours_to_run"]["most"]) == (24.0, 24.0 * 12)


def test_the_supplementary_table_has_a_row_for_each_calibration(cli: Any) -> None:
    rows = list(csv.DictReader(io.StringIO(cli.ok("methods", "B07-01", "-a", "DA", "--csv").out)))
    assert [(row["calibration"], row["stage"], row["coating"]) for row in rows] == [
        ("C0042", "pre", "PFSA"),
        ("C0050", "post", "PFSA"),
    ]
    assert float(rows[1]["exposure_before_h"]) == 24.0


def test_what_was_left_out_is_said_with_its_reason(cli: Any) -> None:
    cli.ok("strike", "calibration", "C0043", "--why", "pump had stopped")
    out = " ".join(cli.ok("methods", "B07-01", "B07-02", "B07-03", "-a", "DA").out.split())
    assert "2 carbon-fibre microelectrodes" in out
    assert "1 probe without a calibration for it left out." in out
    assert "no calibration of these probes" in cli.refused("methods", "B9-01", "-a", "DA")
    cli.ok("strike", "calibration", "C0050", "--why", "pump had stopped")
    out = " ".join(cli.ok("methods", "B07-01", "B07-03", "-a", "DA").out.split())
    assert "Left out: 1 calibration (C0050: pump had stopped)." in out


def test_the_dictionary_has_every_column_with_its_unit(cli: Any) -> None:
    told = cli.ok("dictionary", "--json").json
    assert [(one["sheet"], one["column"]) for one in told] == [(s.name, c.name) for s in SHEETS for c in s.columns]
    units = {one["column"]: one["unit"] for one in told}
    assert (units["concentration_um"], units["duration_min"], units["sensitivity_na_um"]) == ("µM", "min", "nA/µM")
    assert all(one["meaning"] and one["accepts"] for one in told)
    assert len(cli.ok("dictionary", "--csv").out.splitlines()) == len(told) + 1


def test_what_isnt_recorded_is_said_and_an_assumed_time_of_day_gives_no_hours(empty: Any, tmp_path: Any) -> None:
    rows = ("K-1,2024-03-04,12,2024-03-04,9,3", "K-2,2024-03-06,11,,,2")
    heads = "Probe,Pre Date,Pre nA/uM,Post Date,Post nA/uM,Run (h)"
    (tmp_path / "old.csv").write_text("\n".join([heads, *rows]), encoding="utf-8")
    answers = [f"--answer={key}" for key in ("analyte=DA", "waveform=triangle", "setting=in-vivo")]
    empty.ok("adopt", "old.csv", *answers, "--commit")
    out = " ".join(empty.ok("methods", "-a", "DA").out.split())
    assert "Exposed length: not recorded." in out
    assert "temperature not recorded" in out
    assert "Of 2 runs only the day is known, and no time to a calibration." in out
    assert "preceded" not in out
    told = empty.ok("methods", "-a", "DA", "--json").json
    assert (told["hours_to_run"], told["hours_from_run"], told["untimed_runs"]) == (None, None, 2)


def test_the_time_from_a_runs_end_to_its_post_calibration_is_told(cli: Any) -> None:
    told = cli.ok("methods", "B07-01", "-a", "DA", "--json").json
    # the last of twelve runs of two hours began 2026-01-19 at 09:00; the calibration was 2026-01-20 at 09:00
    assert (told["hours_from_run"]["n"], told["hours_from_run"]["mean"]) == (1, 22.0)
    assert "Post-calibration followed the run after" in " ".join(cli.ok("methods", "B07-01", "-a", "DA").out.split())
