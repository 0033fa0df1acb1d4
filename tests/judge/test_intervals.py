"""The methods of OIML D 10 / ILAC-G24 as worked cases; the numbers follow from their formulas, not from the guide."""

import json
from pathlib import Path

import numpy as np
import pytest

from electrolog.errors import InputError
from electrolog.judge.intervals import (
    chart_interval_h,
    exact_share_interval,
    exponential_interval_h,
    keeps_interval,
    shortening,
    simple_response,
    staircase,
)

CASES = json.loads(
    (Path(__file__).parent.parent / "reference" / "intervals" / "interval_rules.json").read_text(encoding="utf-8")
)


@pytest.mark.parametrize(("used", "step"), [(0.5, 1.1), (-0.8, 1.1), (0.9, 1.0), (1.0, 1.0), (1.2, 0.75), (-1.2, 0.75)])
def test_the_staircase_lengthens_well_inside_and_shortens_outside(used, step):
    """Well inside: 80 % of the permitted error, the guide's example."""
    assert staircase(24.0, used) == pytest.approx(24.0 * step)


def test_a_control_chart_sets_the_interval_from_the_drift_less_the_scatter():
    rng = np.random.default_rng(1)
    hours = np.arange(0, 50, 2.0)
    drifting = 0.02 * hours + 0.05 * rng.standard_normal(hours.size)
    assert chart_interval_h(hours, drifting) == pytest.approx((1 - 2 * 0.05) / 0.02, rel=0.1)


def test_a_chart_without_drift_sets_no_limit():
    rng = np.random.default_rng(2)
    assert chart_interval_h(np.arange(20.0), 0.1 * rng.standard_normal(20)) is None


def test_a_chart_of_two_points_is_refused():
    with pytest.raises(InputError, match="three"):
        chart_interval_h([0.0, 1.0], [0.0, 0.1])


@pytest.mark.parametrize("case", CASES["simple_response"]["examples"])
def test_the_simple_response_balances_at_its_target(case):
    assert shortening(case["a"], case["R"]) == pytest.approx(case["b"], rel=1e-12)
    longer = simple_response(10.0, True, longer=case["a"], target=case["R"]) / 10
    shorter = simple_response(10.0, False, longer=case["a"], target=case["R"]) / 10
    assert longer ** case["R"] * shorter ** (1 - case["R"]) == pytest.approx(1.0)


@pytest.mark.parametrize("case", CASES["exponential_reliability"]["examples"])
def test_exponential_reliability_gives_the_interval_of_the_target(case):
    found = exponential_interval_h(case["interval_months"], case["observed_in_tolerance"], case["target"])
    assert found == pytest.approx(case["new_interval_months"], rel=1e-12)


@pytest.mark.parametrize("observed", [0.0, 1.0])
def test_all_or_none_in_tolerance_says_nothing_of_the_rate(observed):
    with pytest.raises(InputError):
        exponential_interval_h(12.0, observed, 0.95)


@pytest.mark.parametrize("case", CASES["binomial_interval_test"]["examples"])
def test_the_binomial_interval_is_clopper_and_pearsons(case):
    assert exact_share_interval(case["k"], case["n"]) == pytest.approx(case["clopper_pearson_95"], rel=1e-9)


def test_an_interval_is_kept_until_the_counts_refute_its_target():
    assert keeps_interval(9, 10, 0.95)
    assert not keeps_interval(27, 40, 0.95)
