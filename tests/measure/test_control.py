"""Control charts against the worked examples of the NIST/SEMATECH e-Handbook of Statistical Methods."""

import numpy as np
import pytest

from electrolog.errors import DataError, InputError
from electrolog.measure.control import cusum, ewma, individuals, moving_range

FLOW = [49.6, 47.6, 49.9, 51.3, 47.8, 51.2, 52.6, 52.4, 53.6, 52.1]
EWMA_SERIES = [52.0, 47.0, 53.0, 49.3, 50.1, 47.0, 51.0, 50.1, 51.2, 50.5, *FLOW]


def test_individuals_chart():
    """e-Handbook 6.3.2.2: mean 50.81, mean moving range 1.8778, limits 45.8159 and 55.8041 (from memory)."""
    chart = individuals(FLOW)
    assert round(chart.centre, 2) == 50.81
    assert (round(chart.lower[0], 4), round(chart.upper[0], 4)) == (45.8159, 55.8041)
    assert chart.signals == ()
    assert round(moving_range(FLOW).centre, 4) == 1.8778
    assert moving_range(FLOW).upper[0] == pytest.approx(3.267 * 1.8777777777778)


def test_ewma_chart():
    """e-Handbook 6.3.2.4: λ 0.3, target 50, s 2.0539; all 21 values to 2 decimals, limits 47.4115 and 52.5884."""
    chart = ewma(EWMA_SERIES, target=50.0, sd=2.0539, weight=0.3)
    published = [
        50.00, 50.60, 49.52, 50.56, 50.18, 50.16, 49.21, 49.75, 49.85, 50.26, 50.33,
        50.11, 49.36, 49.52, 50.05, 49.38, 49.92, 50.73, 51.23, 51.94, 51.99,
    ]  # fmt: skip
    assert np.round(chart.statistic, 2) == pytest.approx(published, abs=1e-9)
    assert chart.lower[-1] == pytest.approx(47.4115, abs=2e-3)
    assert chart.upper[-1] == pytest.approx(52.5884, abs=2e-3)
    assert chart.upper[1] == pytest.approx(50 + 3 * 0.3 * 2.0539)
    assert chart.signals == ()


def test_cusum_chart():
    """e-Handbook 6.3.2.3: target 325, k 0.3175, h 4.1959 in units of the data; table to 2 decimals, signals from 14."""
    x = [
        324.925, 324.675, 324.725, 324.350, 325.350, 325.225, 324.125, 324.525, 325.225, 324.600,
        324.625, 325.150, 328.325, 327.250, 327.825, 328.500, 326.675, 327.775, 326.875, 328.350,
    ]  # fmt: skip
    chart = cusum(x, target=325.0, sd=1.0, slack=0.3175, limit=4.1959)
    high = [3.01, 4.94, 7.45, 10.63, 11.99, 14.44, 16.00, 19.04]
    assert chart.high[12:] == pytest.approx(high, abs=0.0051)
    assert chart.low[[1, 3, 6, 7, 8, 9, 10]] == pytest.approx([0.01, 0.33, 0.56, 0.72, 0.17, 0.25, 0.31], abs=0.0051)
    assert [index + 1 for index, _ in chart.signals] == list(range(14, 21))
    assert chart.signals[0][1] == "drifted up"


def test_cusum_finds_a_drift_down():
    chart = cusum([0.1, -0.2, -1.9, -2.1, -1.8, -2.2], target=0.0, sd=1.0)
    assert chart.signals == ((5, "drifted down"),)


@pytest.mark.parametrize(
    ("tail", "rule"),
    [
        ([4.0], "beyond 3"),
        ([2.5, 0.0, 2.5], "two of three"),
        ([1.5, 1.5, 0.0, 1.5, 1.5], "four of five"),
        ([0.5] * 8, "eight in a row"),
        ([-0.5] * 8, "eight in a row"),
    ],
)
def test_the_usual_rules(tail, rule):
    """Western Electric rules; the baseline of ±0.564 has a moving range of 1.128, so its standard deviation is one."""
    baseline = [0.564, -0.564] * 10
    chart = individuals(baseline + tail, baseline=20)
    assert (len(baseline + tail) - 1, rule) in [(index, text[: len(rule)]) for index, text in chart.signals]
    assert all(index >= 20 for index, _ in chart.signals)


@pytest.mark.parametrize("tail", [[2.9], [2.5, 0.0, 0.0, 2.5], [2.5, -2.5], [1.5, 1.5, 0.0, 0.0, 1.5, 1.5], [0.5] * 7])
def test_one_less_than_the_rules_need_breaks_none(tail):
    assert individuals([0.564, -0.564] * 10 + tail, baseline=20).signals == ()


def test_false_alarms_are_as_rare_as_published():
    """Three standard deviations are passed by 0.27 % of points in control; estimated limits make it a little more."""
    x = np.random.default_rng(12).normal(0, 1, 20_000)
    beyond = [index for index, rule in individuals(x).signals if rule.startswith("beyond 3")]
    assert len(beyond) / 20_000 == pytest.approx(0.0027, abs=0.0012)


def test_a_jump_is_seen_in_the_range():
    chart = moving_range([1.0, 1.1, 0.9, 1.0, 1.1, 4.0, 4.1])
    assert chart.signals == ((5, "a jump beyond the range's limit"),)


def test_a_series_that_never_moves_has_no_rule_to_break():
    assert individuals([2.0, 2.0, 2.0]).signals == ()


def test_what_cannot_be_charted_is_refused():
    with pytest.raises(DataError, match="two points"):
        individuals([1.0])
    with pytest.raises(InputError, match="finite"):
        cusum([1.0, float("nan")], 0, 1)
    with pytest.raises(InputError, match="above zero"):
        ewma([1.0, 2.0], 0, 0)
    with pytest.raises(InputError, match="at most 1"):
        ewma([1.0, 2.0], 0, 1, weight=2)
