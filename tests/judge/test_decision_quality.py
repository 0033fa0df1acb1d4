"""A simulated lab whose truths are known: what is called fit holds, and few good probes are refused."""

import numpy as np
import pytest

from electrolog.judge.verdict import judge
from tests.judge.known_probes import Known, limits, question

PROBES, RISK, RUN_MIN, READING_SD = 800, 0.05, 240.0, 0.04


@pytest.fixture(scope="module")
def lab():
    """Truth now and at the end, what one calibration leaves known (a normal prior's posterior), and the verdicts."""
    rng = np.random.default_rng(11)
    prior_mean, prior_sd = -0.15, 0.12
    truth = rng.normal(prior_mean, prior_sd, PROBES)
    reading = truth + rng.normal(0, READING_SD, PROBES)
    keep = prior_sd**2 / (prior_sd**2 + READING_SD**2)
    loss_rate, loss_sd = 0.02, 0.004
    rate = np.maximum(rng.normal(loss_rate, loss_sd, PROBES), 0)
    end = truth - rate * RUN_MIN / 60
    known = [
        Known(prior_mean + keep * (y - prior_mean), np.sqrt(keep) * READING_SD, loss_rate, loss_sd) for y in reading
    ]
    asked = limits(accepted_risk=RISK)
    verdicts = [judge(question(k, RUN_MIN, limits=asked, reading_sd_log=READING_SD)) for k in known]
    return truth, rate, end, known, verdicts


def called(verdicts, word):
    return np.array([verdict.verdict == word for verdict in verdicts])


def test_among_fit_no_more_break_than_the_accepted_risk_and_the_oracle_calls_hardly_more_fit(lab):
    _, _, end, known, verdicts = lab
    fit, broken = called(verdicts, "fit"), end < np.log(0.7)
    assert fit.sum() > 100
    assert broken[fit].mean() <= RISK + 0.02
    oracle = np.array([k.p_below(0.7, RUN_MIN) <= RISK for k in known])
    assert (fit & ~broken).sum() >= 0.95 * (oracle & ~broken).sum()


def test_after_the_longest_run_as_many_are_broken_as_the_lab_accepts(lab):
    truth, rate, _, _, verdicts = lab
    longest_h = np.array([verdict.longest_run_min for verdict in verdicts]) / 60
    some = longest_h > 0
    broken = truth - rate * longest_h < np.log(0.7)
    assert some.sum() > 400
    assert broken[some].mean() == pytest.approx(RISK, abs=0.02)


def test_the_retired_were_broken_as_often_as_was_said(lab):
    truth, _, _, _, verdicts = lab
    said = np.array([verdict.p_breach_now for verdict in verdicts if verdict.verdict == "retire"])
    broken = truth[called(verdicts, "retire")] < np.log(0.7)
    assert len(said) > 20
    assert said.min() > 0.5
    assert abs(broken.mean() - said.mean()) < 2.5 * np.sqrt((said * (1 - said)).sum()) / len(said)


def test_the_odds_of_a_breach_come_true(lab):
    _, _, end, _, verdicts = lab
    said = np.array([verdict.p_breach for verdict in verdicts])
    broken = end < np.log(0.7)
    for low, high in ((0, 0.1), (0.1, 0.5), (0.5, 0.9), (0.9, 1.01)):
        among = (said >= low) & (said < high)
        spread = np.sqrt((said[among] * (1 - said[among])).sum()) / among.sum()
        assert abs(broken[among].mean() - said[among].mean()) < 3 * spread


def test_the_chance_that_a_calibration_makes_it_fit_comes_true(lab):
    """Calibrate each undecided probe once more: as many become fit as was said beforehand."""
    rng = np.random.default_rng(3)
    truth, _, _, known, verdicts = lab
    said, became = [], []
    for true, k, before in zip(truth, known, verdicts, strict=True):
        if before.verdict != "recalibrate":
            continue
        reading = rng.normal(true, READING_SD)
        keep = k.sd**2 / (k.sd**2 + READING_SD**2)
        after = Known(k.log_share + keep * (reading - k.log_share), np.sqrt(keep) * READING_SD, k.rate, k.rate_sd)
        said.append(before.value_of_calibration.chance_fit)
        became.append(after.p_below(0.7, RUN_MIN) <= RISK)
    assert len(said) > 100
    assert abs(np.mean(said) - np.mean(became)) < 3 * np.sqrt(0.25 / len(said))
