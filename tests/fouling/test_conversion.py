"""Concentrations from currents: closed forms, brute force, and runs of known truth between two calibrations."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from electrolog.fouling.cohort import fit_cohort
from electrolog.fouling.conversion import Curve, band, log_sensitivity_along
from electrolog.fouling.draws import Posterior
from electrolog.fouling.events import EXPOSURE, READING, Events
from electrolog.fouling.fit import CohortFit
from electrolog.fouling.forecast import posterior

UNITS, HOURS, RATE, DAYS = 60, 4.0, 0.08, 20
SHARES = np.array([0.0, 0.25, 0.5, 0.75, 1.0])  # of the last run


# --- the curve --------------------------------------------------------------------------------------------


@pytest.mark.parametrize("affinity_per_um", [0.0, 0.3])
def test_a_current_gives_back_the_concentration_it_came_from(affinity_per_um: float) -> None:
    """The isotherm: Langmuir, J. Am. Chem. Soc. 40 (1918) 1361."""
    true_um = np.array([-0.1, 0.0, 0.5, 3.0])
    signal = 12.0 * true_um / (1 + affinity_per_um * true_um)
    curve = Curve(0.0, 0.0, 0.0, affinity_per_um)
    assert curve.concentration_um(signal, np.full(4, 12.0)) == pytest.approx(true_um)


def test_above_the_flat_of_the_curve_there_is_no_number() -> None:
    assert Curve(0.0, 0.0, 0.0, 0.5).concentration_um(np.array([24.0, 30.0]), np.full(2, 12.0)).tolist() == [np.inf] * 2


def test_the_band_is_the_reciprocal_of_the_sensitivitys() -> None:
    """Without an offset and noise, quantiles of i/s are i over quantiles of s."""
    log_s = np.sort(np.random.default_rng(0).normal(2.3, 0.1, size=(1, 1001)))
    low, middle, high = band(np.array([5.0]), np.zeros(1, dtype=np.int64), log_s, Curve(0.0, 0.0, 0.0))[:, 0]
    quantiles = 5.0 / np.exp(np.quantile(log_s[0], [0.95, 0.5, 0.05]))
    assert [low, middle, high] == pytest.approx(quantiles, rel=2e-3)


def test_the_band_of_a_known_sensitivity_is_that_of_offset_and_noise() -> None:
    """Normal: mean ± 1.645 sd of sqrt(0.3² + 0.4²) = 0.5 nA over 10 nA/µM."""
    log_s = np.full((1, 4096), np.log(10.0))
    low, middle, high = band(np.array([6.0]), np.zeros(1, dtype=np.int64), log_s, Curve(1.0, 0.3, 0.4))[:, 0]
    assert [low, middle, high] == pytest.approx([0.5 - 0.08224, 0.5, 0.5 + 0.08224], abs=2e-3)


@pytest.mark.parametrize("affinity_per_um", [0.0, 0.05])
def test_the_band_at_many_samples_is_that_of_each_alone(affinity_per_um: float) -> None:
    rng = np.random.default_rng(2)
    log_s = rng.normal(2.3, 0.05, size=(3, 512))
    curve = Curve(0.2, 0.05, 0.1, affinity_per_um)
    current, moment = rng.uniform(0.0, 40.0, size=600), rng.integers(0, 3, size=600)
    together = band(current, moment, log_s, curve)
    alone = np.column_stack([band(current[k : k + 1], moment[k : k + 1], log_s, curve) for k in range(600)])
    assert together == pytest.approx(alone, rel=5e-3, abs=2e-3)


def test_a_sample_without_a_current_stays_without_a_number() -> None:
    log_s = np.full((2, 64), 2.0)
    found = band(np.array([1.0, np.nan, 2.0]), np.array([0, 0, 1]), log_s, Curve(0.0, 0.0, 0.0))
    assert np.isnan(found[:, 1]).all()
    assert np.isfinite(found[:, [0, 2]]).all()


# --- along a run ------------------------------------------------------------------------------------------


def life(rng: np.random.Generator, days: np.ndarray) -> tuple[list[tuple[int, int, float]], np.ndarray]:
    """Two runs between three readings, each on a day that others share; and the truth at SHARES of the second run."""
    level, rate = rng.normal(2.3, 0.3), RATE * np.exp(rng.normal(0.0, 0.4))
    rows: list[tuple[int, int, float]] = []
    for turn in range(3):
        day = int(rng.integers(DAYS))
        rows.append((READING, day, level - rate * HOURS * turn + days[day] + rng.normal(0.0, 0.04)))
        if turn < 2:
            rows.append((EXPOSURE, 0, HOURS))
    return rows, level - rate * HOURS * (1 + SHARES)


def events_of(lives: list[list[tuple[int, int, float]]], labels: list[str]) -> Events:
    unit = np.repeat(np.arange(len(lives)), [len(rows) for rows in lives])
    kind, which, amount = (np.array(column) for column in zip(*[row for rows in lives for row in rows], strict=True))
    se = np.where(kind == READING, 0.01, np.nan)
    days = tuple(f"day {k}" for k in range(DAYS))
    return Events(
        unit.astype(np.int64),
        kind.astype(np.int8),
        which.astype(np.int64),
        amount.astype(float),
        se,
        tuple(labels),
        ("in-vivo",),
        (),
        days,
        {},
    )


@pytest.fixture(scope="module")
def fleet() -> tuple[CohortFit, list[list[tuple[int, int, float]]], np.ndarray]:
    rng = np.random.default_rng(11)
    days = rng.normal(0.0, 0.04, DAYS)
    lives, truth = zip(*[life(rng, days) for _ in range(UNITS)], strict=True)
    fit = fit_cohort(events_of(list(lives), [f"u{k}" for k in range(UNITS)]), shapes=("exponential",))
    return fit, list(lives), np.array(truth)


def along(drawn: Posterior, rows: list[tuple[int, int, float]], label: str) -> np.ndarray:
    """(5, D) at SHARES of the second run of the one unit drawn."""
    cut = [[*rows[:3], (EXPOSURE, 0, HOURS * share)] for share in SHARES]
    return log_sensitivity_along(drawn, events_of(cut, [label] * len(cut)), SHARES)


def along_all(fit: CohortFit, lives: list[list[tuple[int, int, float]]], known: int) -> np.ndarray:
    """(U, 5, D) given the first `known` rows of every life."""
    labels = [f"u{k}" for k in range(len(lives))]
    drawn = posterior(fit, events_of([rows[:known] for rows in lives], labels))
    each = zip(lives, labels, strict=True)
    return np.array([along(drawn.only(np.array([k])), rows, label) for k, (rows, label) in enumerate(each)])


def test_at_its_ends_the_run_meets_the_calibrations_own_draws(fleet: tuple) -> None:
    fit, lives, _ = fleet
    drawn = posterior(fit, events_of([lives[0]], ["u0"]))
    found = along(drawn, lives[0], "u0")
    for place, reading in ((0, 1), (-1, 2)):
        expected = drawn.log_sensitivity_at_reading(np.array([reading]))[0]
        assert found[place] == pytest.approx(expected, abs=1e-9)


def test_without_a_reading_after_it_the_run_is_the_forecast(fleet: tuple) -> None:
    fit, lives, _ = fleet
    drawn = posterior(fit, events_of([lives[0][:3]], ["u0"]))
    found = along(drawn, lives[0], "u0")
    for place, share in enumerate(SHARES):
        expected = drawn.log_sensitivity(np.array([[HOURS * share]]))[0]
        assert found[place] == pytest.approx(expected, abs=1e-9)


def test_truths_lie_in_their_bands_and_both_calibrations_narrow_them(fleet: tuple) -> None:
    fit, lives, truth = fleet
    both, forward = (along_all(fit, lives, known) for known in (5, 3))
    low, high = np.quantile(both, [0.05, 0.95], axis=2)
    held = ((low < truth) & (truth < high)).mean()
    assert held == pytest.approx(0.9, abs=2.0 * np.sqrt(0.9 * 0.1 / UNITS))  # moments of one life stray together
    narrow, wide = (
        np.diff(np.quantile(drawn[:, -1], [0.05, 0.95], axis=1), axis=0).mean() for drawn in (both, forward)
    )
    assert narrow < 0.85 * wide
    fixed = np.array([rows[2][2] for rows in lives])[:, None]
    smoothed_error = np.abs(np.median(both, axis=2) - truth).mean()
    assert smoothed_error < 0.5 * np.abs(fixed - truth).mean()


def test_sudden_damage_between_two_readings_falls_anywhere_in_the_run(fleet: tuple) -> None:
    """A probe that lost 60 % in its second run: whole at its start, broken at its end, in between one or the other."""
    fit, lives, _ = fleet
    broken = [*lives[0][:4], (READING, 2, lives[0][4][2] - 0.9)]
    drawn = posterior(fit, events_of([broken], ["other"]))
    assert drawn.damaged[0] > 0.5
    found = along(drawn, broken, "other")
    lost = (found < found[0].mean() - 0.6).mean(axis=1)
    assert lost[0] < 0.05
    assert lost[-1] > 0.6
    assert lost[2] == pytest.approx(lost[-1] / 2, abs=0.15)


def test_a_cut_life_may_hold_settings_the_fit_has_never_seen(fleet: tuple) -> None:
    fit, lives, _ = fleet
    rows = [*lives[0][:3], (EXPOSURE, 1, 1.0)]
    settings = ("in-vivo", "slice")
    whole, cut = (replace(events_of([part], ["u0"]), settings=settings) for part in (rows, rows))
    found = log_sensitivity_along(posterior(fit, whole), cut, np.ones(1))
    assert np.isfinite(found).all()
