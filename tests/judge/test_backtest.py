"""Scores of a backtest against closed forms, tables and a reference library."""

from __future__ import annotations

import numpy as np
import pytest
from scipy import stats

from electrolog.judge import backtest
from electrolog.judge.backtest import Past, Predictive, Targets, fit_verdicts, joined, score

NAN = np.nan


def normal(mean: np.ndarray, sd: float, parts: int = 2000) -> Predictive:
    return Predictive(np.repeat(mean[:, None], parts, axis=1), np.full((len(mean), parts), sd))


def past(rows: list[tuple[int, int, float, float]]) -> Past:
    unit, kind, hours, reading = (np.array(column) for column in zip(*rows, strict=True))
    return Past(unit, kind, hours.astype(float), reading.astype(float))


def targets(hours: list[float], own_hours: list[list[float]], own_reading: list[list[float]]) -> Targets:
    kind = np.zeros(len(hours), dtype=np.int64)
    return Targets(kind, np.array(hours), np.array(own_hours), np.array(own_reading))


def test_scores_of_a_normal_forecast_are_those_of_the_closed_forms() -> None:
    """CRPS of a normal: Gneiting & Raftery, JASA 102 (2007) 359, equation 21; log score: the normal's density."""
    mean, sd = np.array([0.0, 0.3, -1.0]), 0.4
    reading = np.array([0.1, -0.4, -1.0])
    z = (reading - mean) / sd
    crps = sd * (z * (2 * stats.norm.cdf(z) - 1) + 2 * stats.norm.pdf(z) - 1 / np.sqrt(np.pi))
    found = score("normal", normal(mean, sd), reading)
    assert found.crps_each == pytest.approx(crps, abs=2e-3)
    assert found.log_score == pytest.approx(-stats.norm.logpdf(reading, mean, sd).mean(), rel=1e-9)
    assert found.pit == pytest.approx(stats.norm.cdf(z), abs=2e-3)


def test_an_honest_forecast_holds_what_it_promises_and_one_too_sure_does_not() -> None:
    rng = np.random.default_rng(3)
    mean = rng.normal(size=4000)
    reading = mean + rng.normal(scale=0.2, size=4000)
    honest, sure = (score("", normal(mean, sd, 200), reading) for sd in (0.2, 0.1))
    assert [one.share for one in honest.coverage] == pytest.approx([0.5, 0.8, 0.9], abs=0.02)
    assert [one.share for one in sure.coverage] == pytest.approx(
        [2 * stats.norm.cdf(stats.norm.ppf((1 + level) / 2) / 2) - 1 for level in (0.5, 0.8, 0.9)], abs=0.02
    )
    assert stats.chisquare(honest.pit_counts).pvalue > 0.01
    assert stats.chisquare(sure.pit_counts).pvalue < 1e-6
    assert honest.crps < sure.crps
    assert honest.log_score < sure.log_score


def test_a_rivals_spread_is_students_t() -> None:
    """Two-sided 95 % point with 5 degrees of freedom: 2.571, in every table of t."""
    found = backtest.last_value(past([(0, 0, 0, 0.0), (0, 0, 1, 0.1)]), targets([2.0], [[1.0]], [[0.0]]))
    scale = backtest.MAD_TO_SD * 0.1
    below = stats.norm.cdf((2.571 * scale - found.centre[0]) / found.sd[0]).mean()
    assert below == pytest.approx(0.975, abs=5e-4)
    assert found.log_score(np.array([0.05])) == pytest.approx(-stats.t.logpdf(0.05, 5, scale=scale), abs=5e-3)


def test_the_last_value_is_no_wider_for_one_slip_in_the_past() -> None:
    rows = [(unit, 0, float(turn), -0.1 * turn) for unit in range(10) for turn in range(2)]
    clean = backtest.last_value(past(rows), targets([2.0], [[1.0]], [[0.0]]))
    slipped = backtest.last_value(past([*rows[:-1], (9, 0, 1.0, -7.0)]), targets([2.0], [[1.0]], [[0.0]]))
    assert slipped.sd == pytest.approx(clean.sd)


def test_the_own_line_is_the_reference_librarys() -> None:
    hours, reading = [0.0, 2.0, 5.0, 9.0], [2.3, 2.21, 2.0, 1.9]
    line = stats.linregress(hours, reading)
    found = backtest.own_line(
        past([(0, 0, h, y) for h, y in zip(hours, reading, strict=True)]), targets([12.0], [hours], [reading])
    )
    assert found.centre[0, 0] == pytest.approx(line.intercept + 12 * line.slope, rel=1e-12)
    near, far = (
        backtest.own_line(past([(0, 0, 0, 0.0), (0, 0, 1, 0.1), (0, 0, 2, 0.1)]), targets([at], [hours], [reading]))
        for at in (5.0, 50.0)
    )
    assert far.sd[0, 0] > 3 * near.sd[0, 0]


def test_where_no_line_can_be_drawn_the_last_value_stands() -> None:
    known = past([(0, 0, 0.0, 2.0), (0, 0, 3.0, 1.8)])
    asked = targets([4.0, 4.0], [[NAN, 1.0], [1.0, 1.0]], [[NAN, 2.0], [2.1, 2.0]])
    line, last = backtest.own_line(known, asked), backtest.last_value(known, asked)
    assert np.array_equal(line.centre, last.centre)
    assert np.array_equal(line.sd, last.sd)


def test_the_cohort_mean_is_each_waveforms_own() -> None:
    known = past([(0, 0, 0.0, 2.0), (0, 0, 2.0, 1.0), (1, 1, 0.0, 5.0), (1, 1, 2.0, 5.0)])
    asked = Targets(np.array([0, 1]), np.array([4.0, 4.0]), np.full((2, 1), 2.0), np.array([[1.0], [5.0]]))
    assert backtest.cohort_mean(known, asked).centre[:, 0] == pytest.approx([0.0, 5.0])


def test_windows_of_unlike_numbers_of_draws_are_joined() -> None:
    found = joined([normal(np.zeros(2), 1.0, 960), normal(np.ones(3), 1.0, 1024)])
    assert found.centre.shape == found.sd.shape == (5, 960)
    assert found.centre[:, 0].tolist() == [0, 0, 1, 1, 1]


def test_a_verdict_of_fit_is_wrong_where_the_reading_broke_the_limit() -> None:
    """Four runs: fit and right, fit and wrong, not fit by its odds, and one whose limit can't be told."""
    log_end = np.array([[1.0, 1.1], [1.0, 1.1], [1.0, -1.0], [1.0, 1.1]])
    least = np.array([[0.0, 0.0]] * 3 + [[NAN, NAN]])
    reading, least_reading = np.array([1.0, -0.5, 1.0, 1.0]), np.array([0.0, 0.0, 0.0, NAN])
    draws = np.array([[1.0, -1.0]] * 4)
    found = fit_verdicts(log_end, least, 0.1, reading, least_reading, draws)
    assert (found.runs, found.fit, found.wrong, found.expected) == (3, 2, 1, 1.0)
    assert found.low < 0.5 < found.high


def test_fit_verdicts_of_honest_odds_are_wrong_as_often_as_expected() -> None:
    rng = np.random.default_rng(1)
    mean = rng.normal(0.3, 0.2, size=5000)
    draws = mean[:, None] + 0.1 * stats.norm.ppf((np.arange(200) + 0.5) / 200)
    truth = mean + rng.normal(scale=0.1, size=5000)
    found = fit_verdicts(draws, np.zeros_like(draws), 0.1, truth, np.zeros(5000), draws)
    assert found.low <= found.expected / found.fit <= found.high
    assert found.wrong / found.fit < 0.1


def test_a_rivals_error_is_what_its_line_left() -> None:
    """Hours far from zero; the residuals by numpy's own least squares."""
    rng = np.random.default_rng(4)
    hours = np.tile([20.0, 23.0, 25.0, 31.0], 6)
    unit = np.repeat(np.arange(6), 4)
    reading = 3 - 0.04 * hours + rng.normal(0, 0.05, hours.size)
    known = Past(unit, np.zeros(24, dtype=np.int64), hours, reading)
    asked = targets([25.0], [[20.0, 30.0]], [[2.2, 1.8]])
    one_line = np.abs(reading - np.polyval(np.polyfit(hours, reading, 1), hours))
    expected = backtest.student(np.zeros(1), np.array([backtest.MAD_TO_SD * np.median(one_line)])).sd
    assert backtest.cohort_mean(known, asked).sd == pytest.approx(expected)
    own = [
        reading[unit == u] - np.polyval(np.polyfit(hours[unit == u], reading[unit == u], 1), hours[unit == u])
        for u in range(6)
    ]
    spread = backtest.MAD_TO_SD * np.median(np.abs(np.concatenate(own))) * np.sqrt(4 / (4 - 2))
    expected = backtest.student(np.zeros(1), np.array([spread * np.sqrt(1 + 1 / 2)])).sd  # asked at the line's middle
    assert backtest.own_line(known, asked).sd == pytest.approx(expected)
