"""Scatter that grows with the concentration: how often the 95 % interval holds, with and without an allowance."""

import numpy as np
import pytest

from electrolog.errors import DataError, InputError
from electrolog.measure import schemes, weights
from electrolog.measure.calibrate import calibrate
from electrolog.measure.line import fit_line
from electrolog.measure.uneven import allowance, pooled_growth

SLOPE = 12.0
LEVELS = np.array([0, 0.25, 0.5, 1, 2])


def made(random, replicates, share, noise=0.1):
    x = np.repeat(LEVELS, replicates)
    return x, 2 + SLOPE * x + random.normal(size=x.size) * np.hypot(noise, share * SLOPE * x)


def held(share, replicates, times=1500, noise=0.1, **how):
    random, inside, plain = np.random.default_rng(8), 0, 0
    for _ in range(times):
        x, y = made(random, replicates, share, noise)
        chosen = weights.by_scheme(how["weights"], x, y) if "weights" in how else None
        figures = calibrate(x, y, weights=chosen)
        if figures.shape != "line":
            continue
        inside += figures.sensitivity_low_na_um <= SLOPE <= figures.sensitivity_high_na_um
        plain += 1
    return inside / plain


@pytest.mark.parametrize("replicates", [2, 3])
def test_with_replicates_the_default_interval_allows_for_growing_scatter(replicates):
    """The plain one holds 74 to 78 %; the binomial error of 1500 is 0.6 %."""
    assert held(0.06, replicates) > 0.92
    assert 0.94 < held(0.0, replicates, noise=0.4) < 0.98


def test_weights_hold_too_and_without_replicates_only_they_do():
    assert held(0.06, 1) < 0.85
    assert held(0.06, 1, weights="1/x2") > 0.94
    assert held(0.0, 1, noise=0.4, weights="1/x2") > 0.94


def test_slope_and_standard_error_stay_those_of_least_squares():
    x, y = made(np.random.default_rng(1), 4, 0.08)
    figures, line = calibrate(x, y), fit_line(x, y)
    assert (figures.sensitivity_na_um, figures.sensitivity_se_na_um) == (line.slope_na_um, line.slope_se_na_um)
    assert "growing" in figures.interval_route
    own = allowance(line)
    assert figures.sensitivity_high_na_um == pytest.approx(line.slope_na_um + own.half_width_na_um)


def test_the_allowance_is_that_of_the_sandwich_formula():
    """statsmodels has no fixed-variance sandwich; the formula written out with matrices: (X'X)⁻¹X'ΩX(X'X)⁻¹."""
    x, y = made(np.random.default_rng(1), 4, 0.08)
    line = fit_line(x, y)
    design = np.column_stack([np.ones_like(x), x])
    bread = np.linalg.inv(design.T @ design)
    omega = np.diag(np.maximum(x, 0.25) ** 2)
    maker = np.eye(x.size) - design @ bread @ design.T
    size = line.residual_na @ line.residual_na / np.trace(maker @ omega)
    covariance = size * bread @ design.T @ omega @ design @ bread
    assert allowance(line).se_na_um == pytest.approx(np.sqrt(covariance[1, 1]), rel=1e-10)
    freedom = np.trace(maker @ omega) ** 2 / np.trace(maker @ omega @ maker @ omega)
    assert allowance(line).degrees_of_freedom == pytest.approx(freedom, rel=1e-10)


def test_nothing_is_allowed_for_where_replicates_are_missing_or_even_or_weighted():
    x, y = made(np.random.default_rng(1), 1, 0.08)
    assert allowance(fit_line(x, y)) is None
    x, y = made(np.random.default_rng(1), 4, 0.08)
    assert allowance(fit_line(x, y, weights=1 / np.maximum(x, 0.25) ** 2)) is None
    even = np.tile([0.2, -0.2, 0.1, -0.1], 5)
    assert allowance(fit_line(np.repeat(LEVELS, 4), SLOPE * np.repeat(LEVELS, 4) + even)) is None


def test_many_calibrations_together_show_what_one_cannot():
    random = np.random.default_rng(4)
    grown = pooled_growth([made(random, 1, 0.06) for _ in range(20)])
    assert grown.lines == 20
    assert grown.times > 1.5
    assert pooled_growth([made(random, 1, 0.06) for _ in range(5)]) is None
    false = [pooled_growth([made(random, 1, 0.0) for _ in range(20)]) for _ in range(200)]
    assert sum(one is not None for one in false) <= 8  # one in a hundred by chance


@pytest.mark.parametrize(
    ("typed", "known"),
    [("1/X", "1/x"), ("1/x²", "1/x2"), ("none", "equal"), ("replicates", "replicates"), ("200pA + 3%", "0.2nA+3%")],
)
def test_schemes_have_one_spelling(typed, known):
    assert schemes.scheme(typed) == known
    assert schemes.scheme(known) == known


@pytest.mark.parametrize("typed", ["", "x", "0.2nA", "0.2nA+3", "0nA+3%", "0.2V+3%", "-1nA+3%"])
def test_what_is_no_scheme_is_refused(typed):
    with pytest.raises(InputError, match="accepted"):
        schemes.scheme(typed)


def test_a_scheme_gives_the_weights_it_names():
    x, y = made(np.random.default_rng(1), 2, 0.05)
    assert weights.by_scheme("equal", x, y) is None
    assert weights.by_scheme("1/x2", x, y).tolist() == weights.from_concentration(x, 2).tolist()
    assert weights.by_scheme("0.2nA+3%", x, y).tolist() == weights.from_error_model(y, 0.2, 0.03).tolist()
    with pytest.raises(DataError, match="can't give a weight"):
        weights.by_scheme("replicates", x[::2], y[::2])


def test_a_weighted_lines_detection_limit_rests_on_the_scatter_of_a_blank():
    random = np.random.default_rng(2)
    found = []
    for _ in range(300):
        x, y = made(random, 4, 0.05, noise=0.1)
        found.append(calibrate(x, y, weights=weights.from_error_model(SLOPE * x + 1e-9, 0.1, 0.05)).lod_um)
    assert np.median(found) == pytest.approx(3 * 0.1 / SLOPE, rel=0.1)


@pytest.mark.parametrize("through_zero", [True, False])
def test_the_allowance_is_that_of_the_formulas_with_full_matrices(through_zero):
    """Residual maker M = I - H, size yᵀMy / tr(MV), Satterthwaite's tr(MV)² / tr(MVMV), written out here."""
    x = np.repeat(LEVELS[1:], 4)
    y = SLOPE * x * (1 + 0.08 * np.random.default_rng(3).normal(size=x.size))
    found = allowance(fit_line(x, y, through_zero=through_zero))
    design = x[:, None] if through_zero else np.column_stack([np.ones_like(x), x])
    rows = np.linalg.pinv(design)
    maker, variance = np.eye(x.size) - design @ rows, np.diag(x**2)
    scattered = maker @ variance
    size = (y @ maker @ y) / np.trace(scattered)
    assert found.se_na_um == pytest.approx(np.sqrt(size * rows[-1] @ variance @ rows[-1]))
    assert found.degrees_of_freedom == pytest.approx(np.trace(scattered) ** 2 / np.trace(scattered @ scattered))


def test_a_line_without_a_slope_has_no_part_in_the_pooled_growth():
    random = np.random.default_rng(5)
    rising = [made(random, 1, 0.15, noise=0.01) for _ in range(30)]
    flat = [0.0, 1.0, 2.0], [1.0, 2.0, 1.0]
    assert fit_line(*flat).slope_na_um == 0.0
    assert pooled_growth(rising) is not None
    assert pooled_growth([*rising, flat]) == pooled_growth(rising)
