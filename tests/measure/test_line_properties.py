"""What must hold for every line, whatever its points."""

import numpy as np
import pytest
from hypothesis import assume, given
from hypothesis import strategies as st
from numpy.testing import assert_allclose

from electrolog.errors import InputError
from electrolog.measure.line import fit_line, fit_lines

currents = st.lists(st.integers(-4000, 4000), min_size=4, max_size=12).map(lambda whole: np.array(whole) / 64)
factor = st.floats(1e-3, 1e3)


def spread_concentrations(n, seed):
    return np.random.default_rng(seed).uniform(0, 2, n) + np.arange(n) / n


def scattered(x, y):
    """A line through exact points has no scatter whose digits could be compared."""
    fit = fit_line(x, y)
    return fit.residual_sd_na > 1e-6 * np.abs(y).max()


@given(currents, st.integers(0, 1000), factor, st.booleans())
def test_scaling_currents_scales_slope_and_errors(y, seed, by, through_zero):
    x = spread_concentrations(len(y), seed)
    assume(scattered(x, y))
    one, other = (fit_line(x, values, through_zero=through_zero) for values in (y, y * by))
    size = np.abs(y).max() * by
    assert_allclose(other.slope_na_um, one.slope_na_um * by, rtol=1e-9, atol=1e-11 * size)
    assert_allclose(other.slope_se_na_um, one.slope_se_na_um * by, rtol=1e-9)
    assert_allclose(other.residual_sd_na, one.residual_sd_na * by, rtol=1e-9)
    assert_allclose(other.r_squared, one.r_squared, rtol=1e-9, atol=1e-9)


@given(currents, st.integers(0, 1000), factor)
def test_units_cancel(y, seed, by):
    """nA per µM is pA per nM: with both turned, the slope is the same number, and so is the intercept in current."""
    x = spread_concentrations(len(y), seed)
    assume(scattered(x, y))
    one, other = fit_line(x, y), fit_line(x * by, y * by)
    size = np.abs(y).max()
    assert_allclose(other.slope_na_um, one.slope_na_um, rtol=1e-9, atol=1e-11 * size)
    assert_allclose(other.slope_se_na_um, one.slope_se_na_um, rtol=1e-9)
    assert_allclose(other.intercept_na, by * one.intercept_na, rtol=1e-9, atol=1e-10 * size * by)


@given(currents, st.integers(0, 1000), st.randoms(use_true_random=False))
def test_the_order_of_points_changes_nothing(y, seed, random):
    x = spread_concentrations(len(y), seed)
    assume(scattered(x, y))
    order = list(range(len(y)))
    random.shuffle(order)
    one, other = fit_line(x, y), fit_line(x[order], y[order])
    assert_allclose(other.slope_na_um, one.slope_na_um, rtol=1e-9, atol=1e-11 * np.abs(y).max())
    assert_allclose(other.slope_se_na_um, one.slope_se_na_um, rtol=1e-9)


@given(currents, st.integers(0, 1000), st.floats(0.01, 100))
def test_equal_weights_are_no_weights(y, seed, weight):
    x = spread_concentrations(len(y), seed)
    one, other = fit_line(x, y), fit_line(x, y, weights=np.full(len(y), weight))
    assert_allclose(other.slope_na_um, one.slope_na_um, rtol=1e-12, atol=1e-12 * np.abs(y).max())
    assert_allclose(other.intercept_se_na, one.intercept_se_na, rtol=1e-9, atol=1e-12 * np.abs(y).max())


def test_a_weight_of_two_counts_as_two_points():
    x, y = [0.0, 0.5, 1.0, 2.0], [0.1, 5.2, 9.7, 20.4]
    twice = fit_line([*x, 2.0], [*y, 20.4])
    weighted = fit_line(x, y, weights=[1, 1, 1, 2])
    assert weighted.slope_na_um == pytest.approx(twice.slope_na_um, rel=1e-12)
    assert weighted.intercept_na == pytest.approx(twice.intercept_na, rel=1e-12)


def test_many_lines_in_one_call_are_the_lines_one_by_one():
    random = np.random.default_rng(5)
    x, y = random.uniform(0, 2, (50, 5)), random.normal(0, 9, (50, 5))
    w = random.uniform(0.5, 2, (50, 5))
    for through_zero in (False, True):
        many = fit_lines(x, y, weights=w, through_zero=through_zero)
        for i in range(50):
            one = fit_line(x[i], y[i], weights=w[i], through_zero=through_zero)
            assert many.slope_na_um[i] == one.slope_na_um
            assert many.slope_se_na_um[i] == one.slope_se_na_um
            assert many.intercept_se_na[i] == one.intercept_se_na


def test_the_same_concentrations_may_serve_all_lines():
    y = np.random.default_rng(6).normal(0, 9, (7, 5))
    x = np.array([0, 0.25, 0.5, 1, 2])
    assert_allclose(fit_lines(x, y).slope_na_um, fit_lines(np.tile(x, (7, 1)), y).slope_na_um, rtol=0)


def test_points_far_from_zero_keep_their_digits():
    x, y = np.array([0, 1, 2, 3, 4.0]), np.array([1, 3, 2, 5, 4.0])
    near, far = fit_line(x, y), fit_line(x + 2.0**26, y + 2.0**26)
    assert far.slope_na_um == pytest.approx(near.slope_na_um, rel=1e-14)
    assert far.slope_se_na_um == pytest.approx(near.slope_se_na_um, rel=1e-14)


def test_two_points_have_a_slope_and_no_error():
    fit = fit_line([0, 2], [1, 5])
    assert (fit.slope_na_um, fit.intercept_na) == (2, 1)
    assert np.isnan([fit.slope_se_na_um, fit.intercept_se_na, fit.residual_sd_na, fit.r_squared]).all()


def test_no_spread_gives_no_slope():
    fit = fit_line([1, 1, 1], [1, 2, 3])
    assert np.isnan([fit.slope_na_um, fit.slope_se_na_um, fit.intercept_na]).all()


@pytest.mark.parametrize("weights", [[1, 0, 1], [1, -1, 1], [1, np.nan, 1]])
def test_weights_must_be_above_zero(weights):
    with pytest.raises(InputError, match="weight"):
        fit_line([0, 1, 2], [0, 1, 2], weights=weights)


def test_points_must_pair_up():
    with pytest.raises(InputError, match="pair"):
        fit_line([0, 1], [0, 1, 2])
