import numpy as np
import pytest

from electrolog.measure.line import fit_line
from electrolog.measure.points import (
    curvature_p,
    growing_scatter,
    lack_of_fit,
    leverage,
    p_against_zero,
    studentised_residuals,
    suspect_point,
)

X = np.array([0, 0.25, 0.5, 1, 1, 2, 4])
Y = np.array([0.3, 4.6, 10.8, 19.2, 21.0, 41.5, 78.9])


@pytest.mark.parametrize("through_zero", [False, True])
def test_influence_agrees_with_statsmodels(through_zero):
    """statsmodels OLSInfluence: leverage and externally studentised residuals."""
    from statsmodels.regression.linear_model import OLS
    from statsmodels.stats.outliers_influence import OLSInfluence

    theirs = OLSInfluence(OLS(Y, X if through_zero else np.column_stack([np.ones_like(X), X])).fit())
    fit = fit_line(X, Y, through_zero=through_zero)
    assert leverage(fit) == pytest.approx(theirs.hat_matrix_diag, rel=1e-12, abs=1e-15)
    assert studentised_residuals(fit) == pytest.approx(theirs.resid_studentized_external, rel=1e-9)


def test_bend_agrees_with_the_t_test_of_a_quadratic_term():
    from statsmodels.regression.linear_model import WLS

    w = np.array([1, 2, 1, 3, 1, 2, 1.0])
    y = Y - 0.8 * X**2
    theirs = WLS(y, np.column_stack([np.ones_like(X), X, X**2]), weights=w).fit()
    assert theirs.tvalues[2] < 0
    assert curvature_p(fit_line(X, y, weights=w)) == pytest.approx(theirs.pvalues[2] / 2, rel=1e-8)
    upwards = curvature_p(fit_line(X, Y + 3 * X**2, weights=w))
    assert upwards > 0.95


def test_intercept_is_tested_against_zero():
    from statsmodels.regression.linear_model import OLS

    theirs = OLS(Y, np.column_stack([np.ones_like(X), X])).fit()
    fit = fit_line(X, Y)
    p = p_against_zero(fit.intercept_na, fit.intercept_se_na, fit.degrees_of_freedom)
    assert p == pytest.approx(theirs.pvalues[0], rel=1e-10)


def test_the_point_far_off_is_named():
    y = 20 * X + np.array([0.2, -0.3, 0.1, 0.2, -0.2, 0.1, 0])
    y[2] += 15
    suspect = suspect_point(fit_line(X, y))
    assert suspect is not None
    assert (suspect.index, suspect.concentration_um) == (2, 0.5)
    assert suspect.p < 0.001


def test_suspects_among_honest_points_are_as_rare_as_stated():
    random = np.random.default_rng(3)
    found = sum(
        suspect_point(fit_line(X, 20 * X + random.normal(0, 1, X.size)), level=0.05) is not None for _ in range(2000)
    )
    assert found / 2000 == pytest.approx(0.05, abs=0.02)


def test_bends_among_straight_lines_are_as_rare_as_stated():
    random = np.random.default_rng(4)
    x = np.array([0, 0.25, 0.5, 1, 2])
    p = np.array([curvature_p(fit_line(x, 20 * x + random.normal(0, 1, 5))) for _ in range(2000)])
    assert (p < 0.05).mean() == pytest.approx(0.05, abs=0.02)
    assert (p < 0.5).mean() == pytest.approx(0.5, abs=0.05)


def test_four_points_accuse_nobody():
    assert suspect_point(fit_line([0, 1, 2, 3], [0, 10, 20, 31])) is None


def test_points_without_scatter_accuse_nobody():
    x = np.array([0, 0.1, 0.2, 0.7, 1.1])
    assert suspect_point(fit_line(x, 3 * x)) is None
    assert np.isnan(curvature_p(fit_line(x, 3 * x)))


def test_lack_of_fit_needs_replicates():
    test = lack_of_fit(fit_line([0, 1, 2, 3], [0, 10, 20, 31]))
    assert not test.testable
    assert np.isnan(test.f)
    assert not test.significant()


def test_sums_of_squares_add_up():
    w = np.array([1, 2, 1, 3, 1, 2, 1.0])
    fit = fit_line(X, Y, weights=w)
    test = lack_of_fit(fit)
    whole = fit.residual_sd_na**2 * fit.degrees_of_freedom
    assert test.pure_error_na2 + test.lack_of_fit_na2 == pytest.approx(whole, rel=1e-12)
    assert test.pure_error_freedom + test.lack_of_fit_freedom == fit.degrees_of_freedom


def test_scatter_that_grows_with_the_concentration_is_seen():
    x = np.repeat([0, 0.5, 1, 2], 4)
    apart = np.tile([1.0, -1.0, 0.5, -0.5], 4)
    grown = growing_scatter(fit_line(x, 20 * x + apart * (0.1 + x)))
    assert grown is not None
    assert grown.from_um == 1
    assert grown.high_na > 3 * grown.low_na
    assert growing_scatter(fit_line(x, 20 * x + apart)) is None
    assert growing_scatter(fit_line(x, 20 * x + apart * (0.1 + x), weights=1 / (0.1 + x) ** 2)) is None
    assert growing_scatter(fit_line(X, Y)) is None


def test_even_scatter_is_called_growing_as_rarely_as_stated():
    random, x = np.random.default_rng(5), np.repeat([0, 0.5, 1, 2], 3)
    found = [growing_scatter(fit_line(x, 20 * x + random.normal(0, 1, 12)), level=0.05) for _ in range(1500)]
    assert sum(one is not None for one in found) / 1500 == pytest.approx(0.05, abs=0.02)
