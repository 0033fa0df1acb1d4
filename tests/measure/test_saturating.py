import re
from pathlib import Path

import numpy as np
import pytest

from electrolog.errors import DataError
from electrolog.measure.line import fit_line
from electrolog.measure.saturating import fit_saturating

MISRA1D = Path(__file__).parents[1] / "reference" / "nist_strd" / "nonlinear" / "Misra1d.dat"


def certified_isotherm():
    """Misra1d: y = b1·b2·x/(1 + b2·x), NIST StRD nonlinear regression, certified to 11 digits (public domain)."""
    lines = MISRA1D.read_text(encoding="utf-8").splitlines()
    rows = [re.match(r"\s+b[12] =\s+\S+\s+\S+\s+(\S+)\s+(\S+)", line) for line in lines]
    certified = [float(row[i]) for row in rows if row for i in (1, 2)]
    y, x = np.array([[float(cell) for cell in line.split()] for line in lines[60:] if line.strip()]).T
    return certified, x, y


def test_certified_values_leave_the_certified_residuals():
    (current_max, _, affinity, _), x, y = certified_isotherm()
    residual = y - current_max * affinity * x / (1 + affinity * x)
    assert float(residual @ residual) == pytest.approx(5.6419295283e-02, rel=1e-10)


def test_the_isotherm_reaches_the_certified_digits():
    """All eleven printed digits, of the values and of their standard errors."""
    certified, x, y = certified_isotherm()
    fit = fit_saturating(x, y, with_offset=False)
    found = [fit.current_max_na, fit.current_max_se_na, fit.affinity_per_um, fit.affinity_se_per_um]
    assert [f"{value:.10E}" for value in found] == [f"{value:.10E}" for value in certified]
    assert f"{fit.residual_sd_na:.10E}" == "6.8568272111E-02"
    assert fit.degrees_of_freedom == 12


def test_the_sensitivity_is_the_slope_at_low_concentration():
    x = np.array([0, 0.1, 0.2, 0.5, 1, 2, 4])
    fit = fit_saturating(x, 1.5 + 30 * x / (1 + 0.6 * x))
    assert fit.sensitivity_na_um == pytest.approx(30, rel=1e-10)
    assert fit.current_max_na == pytest.approx(50, rel=1e-10)
    assert fit.offset_na == pytest.approx(1.5, rel=1e-9)


def test_linear_ends_where_the_current_falls_short_by_the_share():
    x = np.array([0, 0.1, 0.2, 0.5, 1, 2, 4])
    fit = fit_saturating(x, 30 * x / (1 + 0.6 * x), with_offset=False)
    ends_um = fit.linear_to_um(0.05)
    assert 30 * ends_um / (1 + 0.6 * ends_um) == pytest.approx(0.95 * 30 * ends_um)


def test_standard_errors_cover_the_truth():
    """Of 400 noisy calibrations, 95 % intervals by Student's t hold the true sensitivity nearly 95 % of the time."""
    from scipy.special import stdtrit

    random = np.random.default_rng(11)
    x = np.array([0, 0.25, 0.5, 1, 2, 4, 8])
    held = 0
    for _ in range(400):
        fit = fit_saturating(x, 20 * x / (1 + 0.3 * x) + random.normal(0, 0.3, x.size))
        held += abs(fit.sensitivity_na_um - 20) <= stdtrit(4, 0.975) * fit.sensitivity_se_na_um
    assert 0.92 <= held / 400 <= 0.98


def test_scaling_currents_scales_the_sensitivity_alone():
    x = np.array([0, 0.25, 0.5, 1, 2, 4])
    y = 20 * x / (1 + 0.3 * x) + np.array([0.2, -0.1, 0.15, -0.2, 0.1, -0.05])
    one, other = fit_saturating(x, y), fit_saturating(x, 1000 * y)
    assert other.sensitivity_na_um == pytest.approx(1000 * one.sensitivity_na_um, rel=1e-8)
    assert other.sensitivity_se_na_um == pytest.approx(1000 * one.sensitivity_se_na_um, rel=1e-7)
    assert other.affinity_per_um == pytest.approx(one.affinity_per_um, rel=1e-8)


def test_equal_weights_are_no_weights():
    x = np.array([0, 0.25, 0.5, 1, 2, 4])
    y = 20 * x / (1 + 0.3 * x) + np.array([0.2, -0.1, 0.15, -0.2, 0.1, -0.05])
    one, other = fit_saturating(x, y), fit_saturating(x, y, weights=np.full(6, 7.0))
    assert other.sensitivity_se_na_um == pytest.approx(one.sensitivity_se_na_um, rel=1e-9)


def test_points_that_do_not_saturate_are_refused():
    x = np.array([0, 0.25, 0.5, 1, 2])
    with pytest.raises(DataError, match="no saturation"):
        fit_saturating(x, 20 * x + 2 * x**2)
    with pytest.raises(DataError, match="four concentrations"):
        fit_saturating([0, 1, 1, 2], [0, 9, 11, 15])


def test_a_vanishing_affinity_is_the_line():
    x = np.array([0, 0.25, 0.5, 1, 2, 4])
    y = 20 * x / (1 + 1e-3 * x)
    assert fit_saturating(x, y).sensitivity_na_um == pytest.approx(fit_line(x[:3], y[:3]).slope_na_um, rel=1e-3)


def test_four_concentrations_are_enough():
    x = np.array([0.5, 1.0, 2.0, 4.0])
    fit = fit_saturating(x, 0.3 + 12 * x / (1 + 0.4 * x))
    assert (fit.sensitivity_na_um, fit.affinity_per_um, fit.offset_na) == pytest.approx((12, 0.4, 0.3), rel=1e-6)
    with pytest.raises(DataError, match="found 3"):
        fit_saturating(x[:3], x[:3])
