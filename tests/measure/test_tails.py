import math

import pytest

from electrolog.measure.tails import f_p, t_quantile, two_sided_p


@pytest.mark.parametrize("freedom", [1, 2, 3, 4, 5, 8, 33, 120, 1001, 20_000])
def test_student_agrees_with_scipy(freedom):
    from scipy.special import stdtr, stdtrit

    for probability in (0.5, 0.6, 0.9, 0.95, 0.975, 0.995, 0.9999):
        assert t_quantile(probability, freedom) == pytest.approx(stdtrit(freedom, probability), rel=1e-9, abs=1e-14)
    for t in (0.0, 1e-9, 0.3, -1.0, 2.5, 7.0, -40.0):
        assert two_sided_p(t, freedom) == pytest.approx(2 * stdtr(freedom, -abs(t)), rel=1e-9)


@pytest.mark.parametrize("above", [1, 2, 3, 8, 41, 900])
@pytest.mark.parametrize("below", [1, 2, 5, 12, 77, 2000])
def test_fisher_agrees_with_scipy(above, below):
    from scipy.special import fdtrc

    for f in (0.0, 1e-6, 0.2, 0.9, 1.0, 1.3, 4.0, 30.0, 1e4):
        assert f_p(f, above, below) == pytest.approx(fdtrc(above, below, f), rel=1e-8, abs=1e-280)


def test_printed_quantiles():
    """Abramowitz & Stegun (1964), table 26.10 (from memory)."""
    found = [round(t_quantile(0.975, freedom), 3) for freedom in (1, 2, 3, 10, 120)]
    assert found == [12.706, 4.303, 3.182, 2.228, 1.98]


def test_no_degree_of_freedom_says_nothing():
    assert math.isnan(t_quantile(0.975, 0))
    assert math.isnan(two_sided_p(2.0, 0))
    assert math.isnan(f_p(2.0, 0, 4))
    assert math.isnan(f_p(math.nan, 3, 4))


def test_beyond_all_bounds_nothing_is_left():
    assert two_sided_p(math.inf, 3) == 0
    assert two_sided_p(1e200, 3) == 0
