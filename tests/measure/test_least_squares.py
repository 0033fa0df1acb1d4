import numpy as np
import pytest

from electrolog.errors import DataError
from electrolog.measure.least_squares import least_squares
from electrolog.measure.line import fit_line

X = np.array([0, 0.25, 0.5, 1, 2])
Y = np.array([0.3, 4.8, 10.4, 19.5, 40.1])


@pytest.mark.parametrize("weights", [None, np.array([1, 2, 1, 3, 0.5])])
def test_two_columns_are_the_line(weights):
    line = fit_line(X, Y, weights=weights)
    fit = least_squares(np.column_stack([np.ones(5), X]), Y, weights)
    assert fit.coefficient == pytest.approx([line.intercept_na, line.slope_na_um], rel=1e-12)
    assert fit.standard_error == pytest.approx([line.intercept_se_na, line.slope_se_na_um], rel=1e-12)
    assert fit.covariance[0, 1] == pytest.approx(line.slope_intercept_covariance, rel=1e-12)
    assert fit.residual_sd == pytest.approx(line.residual_sd_na, rel=1e-12)
    assert fit.residual == pytest.approx(line.residual_na, abs=1e-12)


def test_without_a_degree_of_freedom_there_is_no_uncertainty():
    fit = least_squares(np.column_stack([np.ones(2), X[:2]]), Y[:2])
    assert fit.coefficient == pytest.approx([0.3, 18.0])
    assert np.isnan(fit.covariance).all()


@pytest.mark.parametrize("design", [np.column_stack([X, 2 * X]), np.column_stack([X, 0 * X]), np.ones((5, 6))])
def test_columns_that_cannot_be_told_apart_are_refused(design):
    with pytest.raises(DataError, match="can't be told apart"):
        least_squares(design, Y)
