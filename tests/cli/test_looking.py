"""What is drawn at a terminal, what is said instead, and what a pipe never gets."""

from __future__ import annotations

import os
import re
import subprocess
import sys
import time
from pathlib import Path
from typing import Any

import pytest

BOX = "┌"


def test_a_pipe_gets_the_table_alone(judged: Any) -> None:
    for command in (("history", "G0-0"), ("shelf",), ("fit", "-a", "DA")):
        out = judged.ok(*command).out
        assert BOX not in out
        assert "█" not in out


def test_history_draws_readings_band_limit_and_runs(judged: Any) -> None:
    out = " ".join(judged.ok("history", "G0-0", "--chart").out.split())
    assert out.count("o") > 4
    assert "░" in out
    assert "forecast in in-vivo with its 90 % band" in out
    assert "least share left, 60 %" in out
    assert "r end of a run" in out


def test_the_limit_is_its_share_of_the_references_truth(judged: Any) -> None:
    """The lab demands 60 %; level and rate of its probes are known, the first day is an ordinary one."""
    from electrolog.lab import open_lab

    (course,) = open_lab(judged.db).courses(["R1"])
    assert course.limit_na_um == pytest.approx(0.6 * 10.0, rel=0.06)
    first, last = course.ahead[0], course.ahead[-1]
    assert first.exposure_h == pytest.approx(4.0)
    assert last.exposure_h == pytest.approx(8.0)
    assert last.median_na_um / first.median_na_um == pytest.approx(2.718281828 ** (-0.06 * 4), rel=0.08)
    assert last.low_na_um < last.median_na_um < last.high_na_um


def test_without_a_fit_the_chart_says_so_and_does_not_make_one(cli: Any) -> None:
    out = cli.ok("history", "B07-01", "--chart").out
    assert BOX in out
    assert "no forecast: no fit of the cohort is at hand" in " ".join(out.split())
    assert "W cleaning" in out
    assert "C coating" in out


def test_plain_is_sentences(judged: Any) -> None:
    out = judged.ok("history", "G0-0", "--plain").out
    assert BOX not in out
    assert "forecast now: " in out
    assert "90 % interval" in out


def test_history_in_sentences_has_no_table(judged: Any) -> None:
    out = " ".join(judged.ok("history", "R1", "--plain").out.split())
    assert "─" not in out
    assert re.search(r"R1/1, R1, post dopamine triangle, .* after 4 h, [\d.]+ ± [\d.]+ % left", out)


def test_calibrations_draw_points_line_and_what_is_left_over(judged: Any) -> None:
    out = judged.ok("calibrations", "R1", "--chart").out
    assert out.count(BOX) == 4  # of each calibration the line, and beneath it what it leaves over
    assert "left over (nA)" in out
    assert "o 6 points; · line; : detection limit" in out
    for columns in ("60", "80", "200"):
        drawn = judged.process("calibrations", "R1", "--chart", COLUMNS=columns).stdout.decode()
        assert max(map(len, drawn.splitlines())) <= int(columns)


def test_calibrations_point_by_point_in_sentences(judged: Any) -> None:
    out = judged.ok("calibrations", "R1", "--plain").out
    assert BOX not in out
    readings = judged.ok("calibrations", "R1", "--json").json
    assert len(re.findall(r"µM|nM", out)) > sum(len(one["points"]) for one in readings)
    assert re.search(r"  2 µM: 15\.8 nA, 0\.\d+ nA above the line", out)
    assert "isotherm" in judged.ok("calibrations", "R2", "--chart").out


def test_only_the_newest_lines_are_drawn(judged: Any) -> None:
    out = judged.ok("calibrations", "R1", "R2", "--chart").out
    assert out.count(BOX) == 6
    assert "1 earlier one not drawn" in out


def test_along_time_there_is_no_forecast(judged: Any) -> None:
    out = judged.ok("history", "G0-0", "--chart", "--against", "time").out
    assert "days since 2026-01-05" in out
    assert "░" not in out


def test_a_probe_without_calibrations_is_a_plain_sentence(cli: Any) -> None:
    assert cli.ok("history", "B9-01", "--chart").out == "no calibration yet: log one with `electrolog calibrate`\n"


def test_a_probe_calibrated_with_something_else_is_not_said_to_be_without(cli: Any) -> None:
    for command in ("history", "calibrations"):
        out = " ".join(cli.ok(command, "B07-03", "-a", "5-HT").out.split())
        assert out == "no calibration of what was asked for; known: dopamine, triangle (1 calibration)"


def test_no_mark_hides_a_reading_of_nearly_nothing(cli: Any) -> None:
    """Its current was typed in the wrong unit, just after a run: the reading stands where the run's mark would."""
    cli.ok("expose", "B07-03", "--for", "2h", "-s", "in-vivo", "-w", "triangle", "--start", "2026-01-21T09:00Z")
    slip = ("0:0.0001", "0.5uM:0.0061", "1uM:0.0122", "2uM:0.0239")
    cli.ok("calibrate", "B07-03", "post", "DA", *slip, "--at", "2026-01-22T09:00Z", "-w", "triangle", "-y")
    (floor,) = [line for line in cli.ok("history", "B07-03", "--chart").out.splitlines() if line.startswith(" 0┤")]
    assert floor.rstrip("│ ").endswith("o")


def test_residuals_below_the_line_are_drawn_below_it(cli: Any, monkeypatch: pytest.MonkeyPatch) -> None:
    """Line through 5, 10.1 and 20 nA at 0.5, 1 and 2 µM: -0.043, +0.064 and -0.021 nA are left over."""
    monkeypatch.setenv("COLUMNS", "60")
    points = ("0.5uM:5", "1uM:10.1", "2uM:20")
    cli.ok("calibrate", "B9-01", "pre", "DA", *points, "--at", "2026-01-22T09:00Z", "-w", "triangle", "-y")
    chart = cli.ok("calibrations", "B9-01", "--chart").out.partition("left over (nA)")[2].splitlines()
    rows = [line.partition("┤")[2] or line.partition("│")[2] for line in chart]
    level = next(place for place, row in enumerate(rows) if row.startswith("---"))
    assert "o" not in rows[level]
    assert sum(row.count("o") for row in rows[level + 1 : level + 5]) == 2


def test_one_calibration_is_still_a_picture(cli: Any) -> None:
    out = cli.ok("history", "B07-03", "--chart").out
    assert BOX in out


def test_an_endless_interval_does_not_flatten_the_rest(cli: Any) -> None:
    """Two points whose line has no degrees of freedom, beside a usual calibration."""
    cli.ok("calibrate", "B07-03", "post", "DA", "0:0", "1uM:9", "--at", "2026-01-22T09:00Z", "-w", "triangle", "-y")
    out = cli.ok("history", "B07-03", "--chart").out
    assert BOX in out
    assert "inf" not in out
    assert "nan" not in out


def test_five_hundred_calibrations_are_one_chart(empty: Any, tmp_path: Path) -> None:
    folder = tmp_path / "many"
    folder.mkdir()
    (folder / "electrodes.csv").write_text("electrode\nP1\n", encoding="utf-8")
    head = "calibration,electrode,at,stage,analyte,waveform,sensitivity_na_um,sensitivity_se_na_um\n"
    rows = [
        f"K{k:03d},P1,2026-{1 + k // 28 % 12:02d}-{1 + k % 28:02d}T{k // 336:02d}:00Z,interim,dopamine,triangle,"
        f"{12 - k / 100:.3f},0.2\n"
        for k in range(500)
    ]
    (folder / "calibrations.csv").write_text(head + "".join(rows), encoding="utf-8")
    empty.ok("import", str(folder))
    out = empty.ok("history", "P1", "--chart").out
    assert out.count(BOX) == 1
    assert "of 500 calibrations" in empty.ok("history", "P1", "--plain").out


def test_more_probes_than_fit_are_said(judged: Any) -> None:
    out = judged.ok("history", "G0-0..G0-3", "G1-0..G1-3", "--chart").out
    assert out.count(BOX) == 6
    assert "2 more are not drawn" in out


def test_markup_in_words_is_shown_as_it_stands(cli: Any) -> None:
    cli.ok("add", "coating material", "[red]film[/]")
    cli.ok("coat", "B07-03", "-m", "[red]film[/]", "--at", "2026-01-08T09:00Z")
    out = cli.ok("history", "B07-03", "--plain").out
    assert "coating [red]film[/]" in out


def test_the_shelf_shows_trends(cli: Any) -> None:
    out = cli.ok("shelf", "--chart").out
    assert "█" in out
    assert "a full block is the probe's own highest" in " ".join(out.split())
    (probe,) = [one for one in cli.ok("shelf", "--json").json if one["electrode"] == "B07-01"]
    assert probe["trend_na_um"] == pytest.approx([11.93, 7.98], abs=0.01)


def test_the_shelf_in_sentences(cli: Any) -> None:
    lines = cli.ok("shelf", "--plain").out.splitlines()
    assert lines[-1].endswith("probes")
    assert any(line.startswith("B07-01: state renewed, batch B07") for line in lines)


def test_fit_draws_each_kind(judged: Any) -> None:
    out = judged.ok("fit", "-a", "DA", "--chart").out
    assert "share left of a typical probe, bare, triangle" in out
    assert "* exponential" in out
    said = judged.ok("fit", "-a", "DA", "--plain").out
    assert "h in vivo: " in said
    assert BOX not in said


def test_figures_are_written(judged: Any, tmp_path: Path) -> None:
    for ending, begins in ((".png", b"\x89PNG"), (".svg", b"<?xml"), (".pdf", b"%PDF")):
        judged.ok("history", "G0-0", "R1", "--figure", str(tmp_path / f"course{ending}"))
        assert (tmp_path / f"course{ending}").read_bytes().startswith(begins)
    judged.ok("fit", "-a", "DA", "--figure", str(tmp_path / "cohort.svg"))
    assert "exponential" in (tmp_path / "cohort.svg").read_text(encoding="utf-8")


def test_a_figure_of_nothing_is_refused(cli: Any, tmp_path: Path) -> None:
    assert "no such calibration gives a sensitivity" in cli.refused(
        "history", "B9-01", "--figure", str(tmp_path / "a.png")
    )
    assert not (tmp_path / "a.png").exists()


def at_a_terminal(db: str, *arguments: str) -> str:
    """Everything that a real terminal of 80 columns is sent."""
    pty = pytest.importorskip("pty", reason="pseudo-terminals are POSIX's")
    ours, theirs = pty.openpty()
    started = subprocess.Popen(
        [sys.executable, "-m", "electrolog", "--db", db, *arguments],
        stdin=theirs,
        stdout=theirs,
        stderr=theirs,
        env=os.environ | {"COLUMNS": "80", "TERM": "xterm"},
    )
    os.close(theirs)
    said = b""
    deadline = time.monotonic() + 120
    while time.monotonic() < deadline:
        try:
            part = os.read(ours, 65536)
        except OSError:  # the other end was closed
            break
        if not part:
            break
        said += part
    os.close(ours)
    assert started.wait(timeout=30) == 0
    return said.decode()


def test_at_a_terminal_it_is_drawn_unasked(judged: Any) -> None:
    said = at_a_terminal(judged.db, "history", "G0-0")
    assert BOX in said
    assert "\x1b[3" not in said.partition("\x1b[?25h")[2]  # no colour once the progress is gone


def test_what_takes_long_says_so_at_a_terminal(judged: Any) -> None:
    assert "fitting the cohort" in at_a_terminal(judged.db, "fit", "-a", "DA", "--fresh", "--plain")


def test_what_takes_long_is_silent_in_a_pipe(judged: Any) -> None:
    done = judged.process("fit", "-a", "DA", "--fresh", "--json")
    assert (done.returncode, done.stderr) == (0, b"")
