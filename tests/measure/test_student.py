import math

import pytest

from electrolog.measure.student import t_quantile, two_sided_p


@pytest.mark.parametrize("freedom", [1, 2, 3, 4, 5, 8, 33, 120, 1001])
def test_student_agrees_with_scipy(freedom):
    from scipy.special import stdtr, stdtrit

    for probability in (0.5, 0.6, 0.9, 0.95, 0.975, 0.995, 0.9999):
        assert t_quantile(probability, freedom) == pytest.approx(stdtrit(freedom, probability), rel=1e-10, abs=1e-14)
    for t in (0.0, 0.3, -1.0, 2.5, 7.0, -40.0):
        assert two_sided_p(t, freedom) == pytest.approx(2 * stdtr(freedom, -abs(t)), rel=1e-9, abs=2e-15)


def test_printed_quantiles():
    """Abramowitz & Stegun (1964), table 26.10 (from memory)."""
    assert [round(t_quantile(0.975, freedom), 3) for freedom in (1, 2, 3, 10, 120)] == [
        12.706,
        4.303,
        3.182,
        2.228,
        1.98,
    ]


def test_no_degree_of_freedom_says_nothing():
    assert math.isnan(t_quantile(0.975, 0))
    assert math.isnan(two_sided_p(2.0, 0))
