"""What a calibration is worth, against a decision that can be worked out by hand."""

import numpy as np
import pytest
from scipy.special import ndtr, ndtri

from electrolog.judge.value import value_of_calibration

DRAWS = 4000
LOG_NOW = 0.1 * ndtri((np.arange(DRAWS) + 0.5) / DRAWS)
LEAST = -0.05  # broken below this: p = Φ(−0.5) = 0.31
BROKEN = LOG_NOW < LEAST
RISK = 0.05


def worth(reading_sd_log, **changed):
    known = {"reading_sd_log": reading_sd_log, "accepted_risk": RISK}
    return value_of_calibration(LOG_NOW, LOG_NOW, BROKEN, BROKEN, **{**known, **changed})


def exact(reading_sd_log, readings=200_001):
    """The normal posterior in closed form: mean κy, variance κσ², and the odds that it is below LEAST."""
    y = np.hypot(0.1, reading_sd_log) * ndtri((np.arange(readings) + 0.5) / readings)
    kept = 0.1**2 / (0.1**2 + reading_sd_log**2)
    return ndtr((LEAST - kept * y) / (np.sqrt(kept) * reading_sd_log))


@pytest.mark.parametrize("sd", [0.03, 0.06, 0.1])
def test_it_is_what_the_closed_form_says(sd):
    p, found = exact(sd), worth(sd)
    assert found.chance_fit == pytest.approx((p <= RISK).mean(), abs=0.03)
    assert found.chance_any_run == found.chance_fit
    assert found.p_breach_if_fit == pytest.approx(p[p <= RISK].mean(), abs=0.006)
    assert found.p_breach_if_not == pytest.approx(p[p > RISK].mean(), abs=0.04)
    before = BROKEN.mean()
    assert found.narrowing == pytest.approx(1 - (p * (1 - p)).mean() / (before * (1 - before)), abs=0.04)


@pytest.mark.parametrize("stands", [True, False])
def test_what_it_saves_is_the_loss_of_the_better_choice_before_and_after(stands):
    p, cost = exact(0.05), RISK / (1 - RISK)
    before = min(BROKEN.mean(), (1 - BROKEN.mean()) * cost) if stands else (1 - BROKEN.mean()) * cost
    after = np.minimum(p, (1 - p) * cost).mean()
    assert worth(0.05, stands=stands).saved_runs == pytest.approx(before - after, abs=0.002)


def test_a_calibration_that_tells_nothing_changes_nothing():
    found = worth(50.0)
    assert found.narrowing == pytest.approx(0.0, abs=0.01)
    assert (found.chance_fit, found.p_breach_if_fit) == (0.0, None)
    assert found.p_breach_if_not == pytest.approx(BROKEN.mean(), abs=0.01)


def test_a_perfect_one_settles_it():
    found = worth(1e-6)
    assert found.chance_fit == pytest.approx(1 - BROKEN.mean(), abs=0.02)
    assert found.narrowing > 0.95


def test_an_interval_that_stays_too_wide_is_not_fit():
    assert worth(0.05, widest_interval=0.2).chance_fit > 0.4  # the posterior's 90 % width is 0.147
    assert worth(0.05, widest_interval=0.14).chance_fit < 0.1
