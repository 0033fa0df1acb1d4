"""Figures of answers: functions that take and return an Axes, right in what they draw, calm about what is missing."""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path
from typing import Any

import numpy as np
import pytest

from electrolog.answers.course import Course, Held, Mark
from electrolog.answers.fan import Trail
from electrolog.answers.fitting import Day, Estimate
from electrolog.answers.handling import Handling
from electrolog.answers.history import Reading
from electrolog.clock import utc_now
from electrolog.errors import InputError
from electrolog.fouling.typical import TypicalLoss
from electrolog.judge import compare
from electrolog.measure.calibrate import CalibrationFigures, calibrate
from electrolog.show import backtest_figure, cohort_figure, course_figure, groups_figure, line_figure
from tests.show.known_backtest import backtest
from tests.show.test_figures import drawn


def reading(name: str, value: float | None, hours: float = 0.0, **figures: Any) -> Reading:
    own = CalibrationFigures(sensitivity_na_um=value, **figures)
    return Reading(
        electrode="P1",
        calibration=name,
        at=utc_now(),
        stage="pre",
        analyte="dopamine",
        waveform="triangle",
        figures=own,
        row={},
        points=(),
        exposure_h={"in-vivo": hours},
        share_left=None,
        share_left_se=None,
        is_reference=hours == 0.0,
        handling=Handling(),
        specific=(),
        warnings=(),
    )


def course(*readings: Reading, **changed: Any) -> Course:
    plain = Course("P1", "dopamine", "triangle", readings, (), 0.0, (), (), "in-vivo", None, None, "no fit")
    return replace(plain, **changed)


def labels(axes: Any) -> list[str]:
    return [text.get_text() for text in axes.get_legend().get_texts()]


def test_a_course_shows_readings_truth_forecast_limit_and_marks() -> None:
    first = reading("K1", 10.0, sensitivity_low_na_um=9.0, sensitivity_high_na_um=11.0)
    found = course(
        first,
        reading("K2", 8.0, 4.0, sensitivity_se_na_um=0.5),
        marks=(Mark(utc_now(), 0.0, "coating", "PFSA"), Mark(utc_now(), 4.0, "exposure", "in-vivo")),
        believed=(Held(0.0, 9.2, 9.9, 10.5),),
        ahead=(Held(4.0, 7.0, 8.0, 9.0), Held(8.0, 5.0, 6.5, 8.2)),
        limit_na_um=5.0,
        limit_share=0.5,
        why_not_ahead="",
    )
    axes = drawn(course_figure.draw_course, found)
    assert axes.get_ylim()[0] == 0.0
    assert labels(axes) == [
        "forecast, 90 % band",
        "its median, in-vivo",
        "truth as believed, 90 %",
        "calibration, 95 % interval",
        "reference",
        "least share left, 50 %",
        "coating",
        "end of a run",
    ]
    bars = [list(line.get_ydata()) for line in axes.lines if len(line.get_ydata()) == 2]
    assert [9.0, 11.0] in bars
    assert [8.0 - 1.96 * 0.5, 8.0 + 1.96 * 0.5] in bars


def test_a_reading_of_nearly_nothing_is_drawn_whole() -> None:
    axes = drawn(course_figure.draw_course, course(reading("K1", 10.0), reading("K2", 0.008, 4.0)))
    (read,) = [line for line in axes.lines if line.get_label().startswith("calibration")]
    assert not read.get_clip_on()


def test_an_endless_interval_leaves_the_axis_to_the_readings() -> None:
    wild = reading("K1", 10.0, sensitivity_low_na_um=-1e6, sensitivity_high_na_um=1e6)
    axes = drawn(course_figure.draw_course, course(wild))
    assert axes.get_ylim()[1] < 30


def test_a_name_with_a_dollar_sign_is_no_formula(tmp_path: Path) -> None:
    odd = replace(course(reading("K1", 10.0)), electrode="$\\bad{$", why_not_ahead="for $\\reasons{$")
    course_figure.draw(tmp_path / "odd.svg", [odd])
    assert "bad" in (tmp_path / "odd.svg").read_text(encoding="utf-8")


def test_no_reading_is_refused_and_so_are_too_many(tmp_path: Path) -> None:
    with pytest.raises(InputError, match="no such calibration gives a sensitivity"):
        course_figure.draw(tmp_path / "a.png", [course(reading("K1", None))])
    with pytest.raises(InputError, match="13 courses are too many"):
        course_figure.draw(tmp_path / "a.png", [course(reading("K1", 10.0))] * 13)


@pytest.mark.parametrize(
    ("x", "y", "shape"),
    [
        ([0, 0.5, 1, 2, 4], [0.1, 5.1, 10.0, 20.2, 39.9], "line"),
        ([0, 0.5, 1, 2, 4, 8], [0, 4.5, 8.2, 13.9, 21.3, 29.2], "saturating"),
    ],
)
def test_residuals_are_what_the_curve_leaves_over(x: list[float], y: list[float], shape: str) -> None:
    figures = calibrate(x, y, noise_na=0.05)
    assert figures.shape == shape
    points = list(zip(x, y, strict=True))
    axes = drawn(line_figure.draw_residuals, points, figures)
    left = np.asarray(axes.lines[-1].get_ydata())
    assert np.abs(left).max() < 0.4
    assert np.sqrt((left**2).sum() / (figures.degrees_of_freedom or 1)) == pytest.approx(
        figures.residual_sd_na, rel=0.02
    )


def test_the_detection_limit_is_a_line_where_it_lies() -> None:
    figures = calibrate([0, 0.5, 1, 2], [0.0, 5.1, 10.0, 20.1], noise_na=0.2)
    axes = drawn(line_figure.draw_line, [(0, 0.0), (0.5, 5.1), (1, 10.0), (2, 20.1)], figures)
    (at,) = {line.get_xdata()[0] for line in axes.lines if "detection limit" in str(line.get_label())}
    assert at == figures.lod_um


def test_points_without_a_line_have_no_residuals() -> None:
    axes = drawn(line_figure.draw_residuals, [(0, 1.0), (1, 2.0)], CalibrationFigures())
    assert [text.get_text() for text in axes.texts] == ["no line"]


def test_a_fan_draws_ten_thousand_probes_as_one_line() -> None:
    hours = np.linspace(0, 10, 11)
    loss = TypicalLoss(
        "none", "triangle", hours, np.exp(-0.1 * hours), np.exp(-0.06 * hours), np.exp(-0.03 * hours), {}
    )
    loss = replace(loss, by_shape={"exponential": loss.median, "plateau": loss.high})
    trails = [Trail(f"P{k}", "triangle", "none", (0.0, 3.0, 6.0), (1.0, 0.9, 0.7)) for k in range(10_000)]
    axes = drawn(cohort_figure.draw_fan, loss, trails, {"exponential": 0.8, "plateau": 0.2, "none": 0.0})
    assert labels(axes) == ["each probe", "typical, 90 %", "exponential, 80 %", "plateau, 20 %"]
    assert len({line.get_linestyle() for line in axes.lines[1:]}) == 2
    assert len(axes.lines) == 3


def test_readings_beyond_the_frame_are_counted() -> None:
    hours = np.linspace(0, 10, 11)
    loss = TypicalLoss("none", "triangle", hours, *[np.exp(-rate * hours) for rate in (0.1, 0.06, 0.03)], {})
    trails = [Trail("P1", "triangle", "none", (0.0, 3.0, 6.0), (1.0, 9.0, 0.7))]
    assert (
        drawn(cohort_figure.draw_fan, loss, trails, {}).get_title()
        == "bare, triangle: 1 probe; 1 reading above the frame"
    )
    whole = [Trail("P1", "triangle", "none", (0.0, 3.0), (1.0, 0.9))]
    assert "frame" not in drawn(cohort_figure.draw_fan, loss, whole, {}).get_title()


def test_suspicious_days_are_ringed_and_named() -> None:
    day = Day("S-1", "rig-1", "2026-03-02", Estimate(0.01, -0.03, 0.05), 3, 0.02, False)
    odd = replace(day, date="2026-03-05", effect=Estimate(-0.15, -0.2, -0.1), p_bad=0.9, suspicious=True)
    axes = drawn(cohort_figure.draw_days, [day, odd])
    assert [text.get_text() for text in axes.texts] == ["2026-03-05 S-1"]
    (ring,) = [line for line in axes.lines if line.get_markersize() == 11]
    assert list(ring.get_ydata()) == [-15.0]


def test_no_day_is_said() -> None:
    assert [text.get_text() for text in drawn(cohort_figure.draw_days, []).texts] == ["no calibration day"]


def test_reliability_lies_on_the_diagonal_for_honest_forecasts_and_below_for_the_too_sure() -> None:
    axes = drawn(backtest_figure.draw_reliability, backtest())
    lines = {str(line.get_label()): np.asarray(line.get_ydata()) for line in axes.lines}
    levels = np.linspace(0, 1, 101)
    assert np.abs(lines["honest"] - levels).max() < 0.08
    assert lines["sure"][80] < 0.6
    assert len({line.get_linestyle() for line in axes.lines[1:]}) == 2


def test_every_rival_is_drawn_in_a_look_of_its_own() -> None:
    found = backtest()
    rivals = tuple(replace(found.methods[1], method=name) for name in ("last", "line", "mixed", "mean"))
    axes = drawn(backtest_figure.draw_reliability, replace(found, methods=(found.methods[0], *rivals)))
    shown = [line for line in axes.lines if not str(line.get_label()).startswith("_")]
    assert [line.get_label() for line in shown] == ["honest", "last", "line", "mixed", "mean"]
    assert len({str(line.get_linestyle()) + str(line._dash_pattern) for line in shown}) == 5


def test_pit_bars_are_the_counts() -> None:
    found = backtest()
    axes = drawn(backtest_figure.draw_pit, found.methods[0])
    heights = [patch.get_height() for patch in axes.containers[0]]
    assert heights == list(found.methods[0].pit_counts)
    assert sum(heights) == 400


def test_survival_steps_where_probes_end() -> None:
    lives = {"bare": ([2.0, 4.0, 6.0], [True, True, False]), "film": ([5.0, 9.0], [False, True])}
    axes = drawn(groups_figure.draw_survival, lives)
    steps = {str(line.get_label()): line for line in axes.lines}
    assert list(steps["bare (3)"].get_ydata()) == pytest.approx([1.0, 2 / 3, 1 / 3, 1 / 3])
    waiting = [line for line in axes.lines if line.get_marker() == "|"]
    assert [list(line.get_xdata()) for line in waiting] == [[6.0], [5.0]]


def test_spread_shows_every_probe_and_the_mean() -> None:
    values = {"B1": [10.0, 12.0, 11.0], "B2": [9.0]}
    found = compare.compare(compare.Groups(values={"level": values}))
    axes = drawn(groups_figure.draw_spread, "level", values, found.estimates)
    marks = sorted(value for line in axes.lines for value in line.get_ydata() if line.get_marker() == "o")
    assert marks == [9.0, 10.0, 11.0, 12.0]
    assert [text.get_text() for text in axes.get_xticklabels()] == ["B1", "B2"]
