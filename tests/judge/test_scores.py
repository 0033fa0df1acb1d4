"""Scores against their closed forms, and forecasts known to be honest or not."""

import numpy as np
import pytest
from scipy.special import ndtr, ndtri
from scipy.stats import norm

from electrolog.judge.scores import coverage, crps, log_score, odds_score, pit, share_interval

RNG = np.random.default_rng(21)
LEVELS = ndtri((np.arange(4000) + 0.5) / 4000)


def test_crps_of_a_normal_forecast_is_its_closed_form():
    """Gneiting & Raftery, J. Am. Stat. Assoc. 102 (2007) 359, equation 21."""
    truth = np.array([0.0, 0.7, -2.5])
    mean, sd = 0.3, 1.4
    z = (truth - mean) / sd
    density = np.exp(-0.5 * z**2) / np.sqrt(2 * np.pi)
    expected = sd * (z * (2 * ndtr(z) - 1) + 2 * density - 1 / np.sqrt(np.pi))
    assert crps(np.tile(mean + sd * LEVELS, (3, 1)), truth) == pytest.approx(expected, abs=2e-3)


def test_crps_does_not_depend_on_the_number_of_draws_on_average():
    truth = RNG.normal(size=40_000)
    few = crps(RNG.normal(size=(40_000, 5)), truth).mean()
    assert few == pytest.approx(1 / np.sqrt(np.pi), rel=0.02)


def test_log_score_of_a_normal_forecast_adds_the_readings_error():
    reading, sd = np.array([0.4]), np.array([0.5])
    total = np.hypot(1.0, 0.5)
    expected = 0.5 * (0.4 / total) ** 2 + np.log(total * np.sqrt(2 * np.pi))
    assert log_score(LEVELS[None, :], reading, sd)[0] == pytest.approx(expected, abs=1e-3)


def test_honest_forecasts_cover_and_narrow_ones_do_not():
    truth = RNG.normal(size=3000)
    draws = RNG.normal(size=(3000, 400))
    honest, narrow = coverage(draws, truth), coverage(0.5 * draws, truth)
    assert honest.low < 0.9 < honest.high
    assert honest.low < honest.share < honest.high
    assert (honest.count, honest.level) == (3000, 0.9)
    assert narrow.high < 0.7
    assert narrow.mean_width == pytest.approx(honest.mean_width / 2)


def test_pit_is_even_when_the_forecast_is_honest():
    found = pit(RNG.normal(size=(4000, 299)), RNG.normal(size=4000))
    counts = np.histogram(found, bins=10, range=(0, 1))[0]
    assert ((counts - 400) ** 2 / 400).sum() < 27.9  # chi-square table, 9 degrees of freedom, 0.999
    assert ((found > 0) & (found < 1)).all()


def test_a_truth_among_equal_draws_stands_in_their_middle():
    assert pit(np.ones((1, 9)), np.array([1.0]))[0] == pytest.approx(0.5)


def test_share_interval_is_wilsons():
    """Newcombe, Stat. Med. 17 (1998) 857, table I: 81 of 263 is 0.2553 to 0.3662; 0 of 20 is 0 to 0.1611."""
    assert share_interval(81, 263) == pytest.approx((0.2553, 0.3662), abs=5e-5)
    assert share_interval(0, 20) == pytest.approx((0.0, 0.1611), abs=5e-5)
    assert share_interval(0, 0) == (0.0, 1.0)


def test_odds_that_come_true_are_told_from_odds_that_do_not():
    stated = RNG.uniform(size=20_000)
    happened = RNG.uniform(size=20_000) < stated
    honest, boastful = odds_score(stated, happened), odds_score(stated**0.3, happened)
    assert honest.brier == pytest.approx(1 / 6, abs=0.01)
    assert boastful.brier > honest.brier + 0.02
    assert all(abs(said - came) < 0.03 for said, came, _ in honest.classes)
    assert sum(count for *_, count in honest.classes) == 20_000
    assert [int(said * 5) for said, *_ in honest.classes] == [0, 1, 2, 3, 4]
    assert odds_score(np.array([1.0, 0.0]), np.array([True, False])).brier == 0.0


def test_log_score_of_few_draws_is_minus_the_log_of_the_mean_density():
    draws, reading, sd = np.array([[0.1, -0.4, 0.9]]), np.array([0.3]), np.array([0.5])
    expected = -np.log(norm.pdf(reading[0], draws[0], sd[0]).mean())
    assert log_score(draws, reading, sd)[0] == pytest.approx(expected, rel=1e-12)


def test_the_mean_width_is_that_of_the_interval():
    """Of a standard normal, 90 %: 2 · 1.6449."""
    found = coverage(np.vstack([LEVELS, 3 * LEVELS]), np.zeros(2))
    assert found.mean_width == pytest.approx(2 * 2 * 1.6449, rel=1e-3)
