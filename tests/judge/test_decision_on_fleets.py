"""Whole labs of known truth, fitted and forecast as in earnest: fit holds, and hardly fewer are fit than could be."""

from dataclasses import dataclass

import numpy as np
import pytest

from electrolog.judge.facts import CalibrationFacts
from electrolog.judge.shelf import Shelf, judge_shelf
from tests.fouling.fleets.oracle import oracle
from tests.fouling.fleets.ours import answer
from tests.fouling.fleets.simulate import AHEAD_H, fleet
from tests.judge.known_probes import limits

NOISE_NA, RISK = 0.05, 0.05
GOOD_SHARE = 0.65  # of the probes still reach the detection limit after the run


@dataclass(frozen=True)
class Called:
    """Over the probes that can be scored: called fit or retired, called fit by the oracle, truly broken."""

    fit: np.ndarray
    retired: np.ndarray
    oracle: np.ndarray
    broken_at_end: np.ndarray
    broken_now: np.ndarray


def called(family):
    known = fleet(family, 0, 200)
    truth, scored = known.truth, known.truth.scored
    least = np.quantile(truth.log_sensitivity_ahead[scored], 1 - GOOD_SHARE)
    ours, best = answer(known), oracle(known, 500)
    count = len(scored)
    shelf = Shelf(
        run_min=AHEAD_H * 60,
        log_sensitivity_at=lambda minutes: ours.ahead if minutes else ours.now,
        limits=limits(least_share_left=None),
        calibrations=[CalibrationFacts(age_h=1.0, noise_na=NOISE_NA)] * count,
        reference_log_sensitivity=np.full(ours.now.shape, np.nan),
        uses=[0] * count,
        out_of_use=[""] * count,
        needs_um=float(3 * NOISE_NA / np.exp(least)),
    )
    words = np.array([standing.verdict for standing in sorted(judge_shelf(shelf), key=lambda one: one.probe)])
    p_best = np.where(best.ahead < least, best.weights, 0.0).sum(axis=1)
    return Called(
        (words == "fit")[scored],
        (words == "retire")[scored],
        (p_best <= RISK)[scored],
        (truth.log_sensitivity_ahead < least)[scored],
        (truth.log_sensitivity_now < least)[scored],
    )


@pytest.fixture(scope="module")
def labs():
    """A lab whose loss slows down with time, and one that sometimes types a decimal wrong."""
    found = [called(family) for family in ("square-root", "slips")]
    return Called(*(np.concatenate([getattr(one, name) for one in found]) for name in Called.__dataclass_fields__))


def test_among_fit_the_share_that_breaks_is_within_the_accepted_risk(labs):
    assert labs.fit.sum() > 100
    assert labs.broken_at_end[labs.fit].mean() <= RISK + 0.02


def test_nearly_as_many_of_the_good_are_called_fit_as_the_oracle_calls(labs):
    good = ~labs.broken_at_end
    assert (labs.fit & good).sum() >= 0.95 * (labs.oracle & good).sum()


def test_the_retired_were_broken(labs):
    assert labs.retired.sum() > 40
    assert labs.broken_now[labs.retired].mean() > 0.9
