"""When the odds pass the accepted risk, and how many probes the planned runs will take."""

import numpy as np
import pytest

from electrolog.errors import InputError
from electrolog.judge.retirement import breaking_times_min, life, probes_to_make, runs_within
from electrolog.judge.verdict import judge
from tests.judge.known_probes import Known, fresh, limits, question


def test_a_known_loss_breaks_when_it_must():
    sure = Known(sd=0.0, rate=0.05)
    hours = -np.log(0.7) / 0.05
    found = life(question(sure))
    assert found.broken_min == pytest.approx((hours * 60,) * 3, rel=1e-3)
    assert found.accepted_min == pytest.approx(hours * 60, rel=1e-3)


def test_the_accepted_risk_is_passed_where_the_verdict_says_so():
    asked = question(Known(log_share=-0.05, sd=0.05, rate=0.04, rate_sd=0.008))
    assert life(asked).accepted_min == pytest.approx(judge(asked).longest_run_min, abs=6)


def test_the_interval_holds_the_truths():
    """Losses drawn anew from what is known: 90 % break within the interval."""
    probe = Known(log_share=-0.1, sd=0.05, rate=0.05, rate_sd=0.01)
    low, _, high = life(question(probe)).broken_min
    rng = np.random.default_rng(6)
    now, rate = probe.log_share + probe.sd * rng.standard_normal(4000), 0.05 + 0.01 * rng.standard_normal(4000)
    breaks = 60 * (now - np.log(0.7)) / rate
    assert ((breaks >= low) & (breaks <= high)).mean() == pytest.approx(0.9, abs=0.02)


def test_the_strictest_limit_ends_a_life():
    probe = Known(sd=0.0, rate=0.05)
    lod = limits(highest_detection_limit=3 * 0.05 / 9)  # reached at 90 % of the sensitivity, before the share's 70 %
    assert life(question(probe, limits=lod)).broken_min[1] == pytest.approx(-np.log(0.9) / 0.05 * 60, rel=1e-2)


def test_a_probe_that_never_fouls_has_no_end_in_sight():
    found = life(question(Known(rate=0.0)))
    assert found.accepted_min is None
    assert found.broken_min == (None, None, None)


def test_a_broken_probe_is_at_its_end():
    assert life(question(Known(log_share=-2.0))).broken_min == (0.0, 0.0, 0.0)


def test_what_can_not_be_told_is_not_told():
    assert life(question(limits=limits(accepted_risk=None))) is None
    assert life(question(calibration=fresh(noise_na=None), needs_um=0.05)) is None
    assert life(question(reference_log_sensitivity=None)) is None


def test_whole_runs_fit_into_a_life():
    times = breaking_times_min(question(Known(sd=0.0, rate=0.05)))
    assert set(runs_within(times, 180.0)) == {2.0}
    assert set(runs_within(times, 180.0, uses_left=1)) == {1.0}


def test_a_perfect_yield_makes_what_is_missing():
    shelf = np.full((3, 200), 2.0)
    found = probes_to_make(10, shelf, np.array([1.0]), good=100_000, made=100_000)
    assert (found.likely, found.enough) == (4, 4)
    assert found.runs_on_shelf == (6.0, 6.0, 6.0)


def test_half_the_yield_takes_about_twice_and_enough_takes_more():
    """Losses before the 10th success at p = ½ are negative binomial: median 19 made, 90 % quantile 25 (tables)."""
    found = probes_to_make(10, np.zeros((0, 0)), np.array([1.0]), good=50_000, made=100_000)
    assert abs(found.likely - 19) <= 1
    assert abs(found.enough - 26) <= 2


def test_a_yield_known_from_few_is_wide_and_asks_for_more():
    few = probes_to_make(10, np.zeros((0, 0)), np.array([1.0]), good=2, made=4)
    many = probes_to_make(10, np.zeros((0, 0)), np.array([1.0]), good=200, made=400)
    assert few.enough > many.enough
    assert few.yield_share[0] < 0.2 < many.yield_share[0]
    assert "2 usable of 4 made" in few.said


def test_enough_on_the_shelf_makes_none():
    assert probes_to_make(5, np.full((6, 50), 1.0), np.array([1.0]), good=1, made=2).enough == 0


def test_new_probes_that_never_serve_can_not_be_enough():
    assert probes_to_make(5, np.zeros((0, 0)), np.array([0.0]), good=5, made=10).enough is None
    mostly_enough = np.where(np.arange(500) < 350, 5.0, 4.0)[None, :]
    found = probes_to_make(5, mostly_enough, np.array([0.0]), good=5, made=10)
    assert (found.likely, found.enough) == (0, None)


@pytest.mark.parametrize(("good", "made", "runs"), [(3, 2, 1), (-1, 2, 1), (1, 2, -1)])
def test_counts_that_can_not_be_are_refused(good, made, runs):
    with pytest.raises(InputError):
        probes_to_make(runs, np.zeros((0, 0)), np.array([1.0]), good=good, made=made)
