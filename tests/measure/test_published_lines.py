"""Lines against worked examples; each source stands beside its numbers."""

import numpy as np
import pytest

from electrolog.measure.line import fit_line
from electrolog.measure.points import lack_of_fit, p_against_zero
from electrolog.measure.weights import from_sd


def test_fluorescein_line():
    """Miller & Miller, Statistics and Chemometrics for Analytical Chemistry, ch. 5 (roundings from memory)."""
    fit = fit_line([0, 2, 4, 6, 8, 10, 12], [2.1, 5.0, 9.0, 12.6, 17.3, 21.0, 24.7])
    assert round(fit.slope_na_um, 2) == 1.93
    assert round(fit.intercept_na, 2) == 1.52
    assert round(fit.residual_sd_na, 4) == pytest.approx(0.4329, abs=1.01e-4)
    assert round(fit.slope_se_na_um, 4) == 0.0409
    assert round(fit.intercept_se_na, 4) == pytest.approx(0.2950, abs=1.01e-4)
    assert fit.r_squared**0.5 == pytest.approx(0.9989, abs=5e-5)


def test_thermometer():
    """JCGM 100:2008 (GUM) annex H.3, table H.6: correction against temperature less 20 °C."""
    temperature = [21.521, 22.012, 22.512, 23.003, 23.507, 23.999, 24.513, 25.002, 25.503, 26.010, 26.511]
    correction = [-0.171, -0.169, -0.166, -0.159, -0.164, -0.165, -0.156, -0.157, -0.159, -0.161, -0.160]
    fit = fit_line(np.subtract(temperature, 20), correction)
    assert round(fit.intercept_na, 4) == -0.1712
    assert round(fit.intercept_se_na, 4) == 0.0029
    assert round(fit.slope_na_um, 5) == 0.00218
    assert round(fit.slope_se_na_um, 5) == 0.00067
    assert round(fit.residual_sd_na, 4) == 0.0035
    correlation = fit.slope_intercept_covariance / (fit.slope_se_na_um * fit.intercept_se_na)
    assert round(correlation, 3) == -0.930
    assert round(float(fit.current_at(np.array([10.0]))[0]), 4) == -0.1494


def test_cadmium_by_atomic_absorption():
    """EURACHEM/CITAC CG 4, Quantifying Uncertainty in Analytical Measurement (3rd ed. 2012), example A5."""
    concentration = np.repeat([0.1, 0.3, 0.5, 0.7, 0.9], 3)
    absorbance = [
        0.028,
        0.029,
        0.029,
        0.084,
        0.083,
        0.081,
        0.135,
        0.131,
        0.133,
        0.180,
        0.181,
        0.183,
        0.215,
        0.230,
        0.216,
    ]
    fit = fit_line(concentration, absorbance)
    assert round(fit.slope_na_um, 4) == 0.2410
    assert round(fit.slope_se_na_um, 4) == 0.0050
    assert round(fit.intercept_na, 4) == 0.0087
    assert round(fit.intercept_se_na, 4) == 0.0029
    assert round(fit.residual_sd_na, 6) == pytest.approx(0.005486, abs=1.01e-6)
    assert round(fit.r_squared**0.5, 3) == 0.997
    assert fit.spread_um2 == pytest.approx(1.2, rel=1e-12)


def test_open_textbook_example():
    """Harvey, Analytical Chemistry 2.1, examples 5.9 and 5.10: the residual sd and its errors are printed to 4 digits.

    Its weighted line is checked against the value the same book prints from R, not against its hand calculation.
    """
    x, y = [0, 0.1, 0.2, 0.3, 0.4, 0.5], [0, 12.36, 24.83, 35.91, 48.79, 60.42]
    fit = fit_line(x, y)
    assert round(fit.slope_na_um, 3) == 120.706
    assert round(fit.intercept_na, 3) == 0.209
    assert fit.residual_sd_na == pytest.approx(0.4035, rel=1e-3)
    weighted = fit_line(x, y, weights=from_sd([0.02, 0.02, 0.07, 0.13, 0.22, 0.33]))
    assert round(weighted.slope_na_um, 3) == 122.641
    assert round(weighted.intercept_na, 4) == 0.0445


def test_weighted_line():
    """Miller & Miller, ch. 5, weighted regression (published roundings from memory)."""
    x, y = [0, 2, 4, 6, 8, 10], [0.009, 0.158, 0.301, 0.472, 0.577, 0.739]
    weights = from_sd([0.001, 0.004, 0.010, 0.013, 0.017, 0.022])
    assert weights == pytest.approx([5.535, 0.346, 0.055, 0.033, 0.019, 0.012], abs=6e-4)
    fit = fit_line(x, y, weights=weights)
    assert (round(fit.slope_na_um, 4), round(fit.intercept_na, 4)) == (0.0738, 0.0091)
    plain = fit_line(x, y)
    assert (round(plain.slope_na_um, 4), round(plain.intercept_na, 4)) == (0.0725, 0.0133)


@pytest.mark.parametrize(
    ("y", "u", "a", "u_a", "b", "u_b", "covariance", "chi2"),
    [
        ([3.3, 5.6, 7.1, 9.3, 10.7, 12.1], [0.5] * 6, 1.867, 0.465, 1.757, 0.120, -0.050, 1.665),
        ([3.2, 4.3, 7.6, 8.6, 11.7, 12.8], [0.5, 0.5, 0.5, 1, 1, 1], 0.885, 0.530, 2.057, 0.178, -0.082, 4.131),
    ],
)
def test_straight_line_calibration_functions(y, u, a, u_a, b, u_b, covariance, chi2):
    """ISO/TS 28037:2010, 6.3, with equal and unequal weights; its uncertainties take the stated u(y) as known.

    Ours estimate the scatter from the residuals; dividing by √(χ²/ν) turns one into the other.
    """
    fit = fit_line([1, 2, 3, 4, 5, 6], y, weights=from_sd(u))
    chi2_found = float(((fit.residual_na / u) ** 2).sum())
    known = (chi2_found / fit.degrees_of_freedom) ** 0.5
    assert round(fit.intercept_na, 3) == a
    assert round(fit.slope_na_um, 3) == b
    assert round(fit.intercept_se_na / known, 3) == u_a
    assert round(fit.slope_se_na_um / known, 3) == u_b
    assert round(fit.slope_intercept_covariance / known**2, 3) == covariance
    assert round(chi2_found, 3) == chi2


def test_unknown_weights():
    """ISO/TS 28037:2010, annex E: the scatter estimated from the residuals."""
    fit = fit_line([1, 2, 3, 4, 5, 6], [3.014, 5.225, 7.004, 9.061, 11.201, 12.762])
    assert (round(fit.intercept_na, 3), round(fit.intercept_se_na, 3)) == (1.172, 0.159)
    assert (round(fit.slope_na_um, 3), round(fit.slope_se_na_um, 3)) == (1.964, 0.041)
    assert round(fit.slope_intercept_covariance, 3) == -0.006


def test_lack_of_fit_of_the_bank_example():
    """Neter, Wasserman & Kutner, Applied Linear Statistical Models, bank example (also Penn State STAT 501)."""
    x = [125, 100, 200, 75, 150, 175, 75, 175, 125, 200, 100]
    y = [160, 112, 124, 28, 152, 156, 42, 124, 150, 104, 136]
    fit = fit_line(x, y)
    test = lack_of_fit(fit)
    assert (round(fit.intercept_na, 2), round(fit.slope_na_um, 4)) == (50.72, 0.4867)
    assert (round(test.pure_error_na2, 1), test.pure_error_freedom) == (1148.0, 5)
    assert (round(test.lack_of_fit_na2, 1), test.lack_of_fit_freedom) == (13593.6, 4)
    assert (round(test.f, 1), round(test.p, 4)) == (14.8, 0.0056)
    assert test.significant()


def test_lack_of_fit_with_many_repeats():
    """Draper & Smith, Applied Regression Analysis, the example of 24 points with repeats (from memory)."""
    x = [
        1.3,
        1.3,
        2.0,
        2.0,
        2.7,
        3.3,
        3.3,
        3.7,
        3.7,
        4.0,
        4.0,
        4.0,
        4.7,
        4.7,
        4.7,
        5.0,
        5.3,
        5.3,
        5.3,
        5.7,
        6.0,
        6.0,
        6.3,
        6.7,
    ]
    y = [
        2.3,
        1.8,
        2.8,
        1.5,
        2.2,
        3.8,
        1.8,
        3.7,
        1.7,
        2.8,
        2.8,
        2.2,
        5.4,
        3.2,
        1.9,
        1.8,
        3.5,
        2.8,
        2.1,
        3.4,
        3.2,
        3.0,
        3.0,
        5.9,
    ]
    fit = fit_line(x, y)
    test = lack_of_fit(fit)
    assert (round(fit.intercept_na, 3), round(fit.slope_na_um, 3)) == (1.436, 0.338)
    assert (round(test.pure_error_na2, 2), test.pure_error_freedom, test.lack_of_fit_freedom) == (12.47, 11, 11)
    assert round(test.f, 1) == 0.7
    assert not test.significant()


def test_lack_of_fit_of_arsenic_in_water(arsenic):
    """Graybill & Iyer, Regression Analysis (1994); F and p recomputed with numpy and scipy."""
    test = lack_of_fit(fit_line(*arsenic))
    assert (test.pure_error_freedom, test.lack_of_fit_freedom) == (24, 6)
    assert test.f == pytest.approx(0.8682825951041244, rel=1e-11)
    assert test.p == pytest.approx(0.532183241634637, rel=1e-9)


def test_lack_of_fit_of_cadmium(cadmium):
    """Millard & Neerchal, Environmental Statistics with S-Plus (2001), pp. 566-575: F 0.982, p 0.4144."""
    fit = fit_line(*cadmium)
    test = lack_of_fit(fit)
    assert round(test.f, 3) == 0.982
    assert round(test.p, 4) == 0.4144
    assert round((fit.slope_na_um / fit.slope_se_na_um) ** 2, 3) == 9356.879
    assert round(test.pure_error_na2 + test.lack_of_fit_na2, 2) == 152.43


def test_a_load_cell_is_not_straight():
    """NIST/SEMATECH e-Handbook 2.3.6.5, LOADCELL.DAT; F recomputed from the data: the page's has lost digits."""
    load = np.repeat([2, 4, 6, 8, 10, 12, 14, 16, 18, 20, 21], 3)
    response = [
        [0.20024, 0.20016, 0.20024],
        [0.40056, 0.40045, 0.40054],
        [0.60087, 0.60075, 0.60086],
        [0.80130, 0.80122, 0.80127],
        [1.00173, 1.00164, 1.00173],
        [1.20227, 1.20218, 1.20227],
        [1.40282, 1.40278, 1.40279],
        [1.60344, 1.60339, 1.60341],
        [1.80412, 1.80409, 1.80411],
        [2.00485, 2.00481, 2.00483],
        [2.10526, 2.10524, 2.10524],
    ]
    fit = fit_line(load, np.ravel(response))
    test = lack_of_fit(fit)
    assert test.f == pytest.approx(112.23997927520622, rel=1e-9)
    assert test.p == pytest.approx(2.776e-16, rel=1e-3)
    assert p_against_zero(fit.intercept_na, fit.intercept_se_na, fit.degrees_of_freedom) < 1e-8
