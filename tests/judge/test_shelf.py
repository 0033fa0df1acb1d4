"""A whole shelf gets the verdicts that each probe would get alone, best first and at once."""

import time

import numpy as np
import pytest

from electrolog.errors import InputError
from electrolog.judge.facts import CalibrationFacts
from electrolog.judge.shelf import Shelf, judge_shelf
from electrolog.judge.verdict import judge
from tests.judge.known_probes import DRAWS, Known, fresh, limits, question, shelf_of

KINDS = [
    (Known(rate=0.02), fresh(), 0, ""),
    (Known(log_share=-0.1, rate=0.02), fresh(), 0, ""),
    (Known(log_share=-1.0), fresh(), 0, ""),
    (Known(log_share=-0.15, sd=0.15, rate=0.01), fresh(), 0, ""),
    (Known(sd=0.01, rate=0.3), fresh(), 0, ""),
    (Known(log_share=np.log(0.7) - 0.005, sd=0.01, rate=0.02), fresh(), 0, ""),
    (Known(), fresh(age_h=50.0), 0, ""),
    (Known(), fresh(events_since=("cleaned",)), 0, ""),
    (Known(), fresh(noise_na=None), 0, ""),
    (Known(), fresh(r_squared=0.8), 0, ""),
    (Known(rate=0.0), fresh(noise_na=None, residual_sd_na=0.05, residual_degrees_of_freedom=2), 0, ""),
    (Known(), fresh(), 9, ""),
    (Known(), fresh(), 0, "retired on 3 May"),
    (Known(), None, 0, ""),
]


def test_each_probe_gets_the_verdict_it_would_get_alone():
    asked = shelf_of(KINDS)
    standings = {standing.probe: standing for standing in judge_shelf(asked)}
    for index, (probe, facts, uses, why) in enumerate(KINDS):
        alone = judge(question(probe, limits=asked.limits, calibration=facts, uses=uses, out_of_use=why))
        assert standings[index].verdict == alone.verdict
        if not why:
            assert standings[index].p_breach == (None if alone.p_breach is None else pytest.approx(alone.p_breach))
            assert standings[index].sensitivity_na_um == pytest.approx(alone.sensitivity_na_um.end[1], rel=1e-3)
            assert standings[index].fraction_left == pytest.approx(alone.fraction_left.end[1], rel=1e-3)
            if facts and facts.noise_na:
                assert standings[index].lod_um == pytest.approx(alone.lod_um.end[1], rel=1e-3)
    assert {standing.verdict for standing in standings.values()} == {"fit", "recalibrate", "undetermined", "retire"}


def test_the_best_stands_first():
    standings = judge_shelf(shelf_of(KINDS))
    words = [standing.verdict for standing in standings]
    assert words == sorted(words, key=["fit", "recalibrate", "undetermined", "retire"].index)
    fit = [standing.p_breach for standing in standings if standing.verdict == "fit"]
    assert fit == sorted(fit)
    assert standings[-1].reasons


def test_a_probe_without_reference_can_not_be_fit_for_a_share():
    reference = np.full((1, DRAWS), np.nan)
    (standing,) = judge_shelf(shelf_of(KINDS[:1], reference_log_sensitivity=reference))
    assert (standing.verdict, standing.p_breach, standing.fraction_left) == ("undetermined", None, None)


def test_a_run_of_nothing_is_refused_for_the_shelf_too():
    with pytest.raises(InputError):
        judge_shelf(shelf_of(KINDS, run_min=0.0))


def test_ten_thousand_probes_are_judged_in_two_seconds_of_work():
    rng = np.random.default_rng(2)
    count, draws = 10_000, 256
    log_share = rng.normal(-0.2, 0.15, (count, 1))
    spread = 0.05 * rng.standard_normal((count, draws))
    reference = np.full((count, draws), np.log(10.0))
    facts = [CalibrationFacts(age_h=float(age), noise_na=0.05, r_squared=0.99) for age in rng.uniform(0, 200, count)]
    asked = Shelf(
        run_min=240.0,
        log_sensitivity_at=lambda minutes: reference + log_share + spread - 0.03 * minutes / 60,
        limits=limits(highest_detection_limit=0.1),
        calibrations=facts,
        reference_log_sensitivity=reference,
        uses=[0] * count,
        out_of_use=[""] * count,
    )
    began = time.process_time()
    standings = judge_shelf(asked)
    assert time.process_time() - began < 2.0
    assert len({standing.probe for standing in standings}) == count
