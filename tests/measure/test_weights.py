import numpy as np
import pytest

from electrolog.errors import DataError, InputError
from electrolog.measure import weights
from electrolog.measure.line import fit_line

X = np.array([0, 0, 0.25, 0.25, 0.5, 0.5, 1, 1, 2, 2])
Y = np.array([0.1, -0.2, 4.8, 5.3, 10.4, 9.6, 19.1, 20.9, 38.0, 42.1])


@pytest.mark.parametrize(
    "w",
    [
        weights.from_concentration(X, 1),
        weights.from_concentration(X, 2),
        weights.from_replicates(X, Y),
        weights.from_error_model(Y, 0.2, 0.05),
    ],
)
@pytest.mark.parametrize("through_zero", [False, True])
def test_weighted_lines_agree_with_statsmodels(w, through_zero):
    """statsmodels WLS: values, standard errors, r² (about zero where the line is held there)."""
    from statsmodels.regression.linear_model import WLS

    theirs = WLS(Y, X if through_zero else np.column_stack([X, np.ones_like(X)]), weights=w).fit()
    ours = fit_line(X, Y, weights=w, through_zero=through_zero)
    assert ours.slope_na_um == pytest.approx(theirs.params[0], rel=1e-12)
    assert ours.slope_se_na_um == pytest.approx(theirs.bse[0], rel=1e-11)
    assert ours.r_squared == pytest.approx(theirs.rsquared, rel=1e-12)
    assert ours.residual_sd_na == pytest.approx(theirs.scale**0.5, rel=1e-11)
    if not through_zero:
        assert ours.intercept_na == pytest.approx(theirs.params[1], rel=1e-9)
        assert ours.intercept_se_na == pytest.approx(theirs.bse[1], rel=1e-11)


def test_weights_have_mean_one():
    assert weights.from_concentration(X, 2).mean() == pytest.approx(1)
    assert weights.from_error_model(Y, 0.2, 0.05).mean() == pytest.approx(1)


def test_a_blank_weighs_as_much_as_the_lowest_concentration():
    w = weights.from_concentration([0, 0.5, 1], 1)
    assert w[0] == w[1] == pytest.approx(2 * w[2])


def test_an_error_model_without_a_relative_part_is_no_weight():
    assert weights.from_error_model(Y, 0.3, 0.0) == pytest.approx(np.ones(10))


def test_replicates_weigh_by_their_own_scatter():
    w = weights.from_replicates([1, 1, 2, 2], [1, 3, 10, 16])
    assert w[0] / w[2] == pytest.approx(9)


def test_weights_that_cannot_be_are_refused():
    with pytest.raises(DataError, match="2 µM"):
        weights.from_replicates([1, 1, 2], [1, 2, 3])
    with pytest.raises(DataError, match="1 µM"):
        weights.from_replicates([1, 1, 2, 2], [3, 3, 4, 5])
    with pytest.raises(DataError, match="above zero"):
        weights.from_concentration([0, 0], 1)
    with pytest.raises(InputError, match="above zero"):
        weights.from_sd([1, 0])
