"""Against the NIST Statistical Reference Datasets, linear regression (NIST/ITL; U.S. government work, public domain).

The .dat files stand whole in tests/reference/nist_strd/linear; values and standard errors are certified to 15 digits.
"""

import math
import re
from fractions import Fraction
from pathlib import Path

import numpy as np
import pytest

from electrolog.measure.least_squares import least_squares
from electrolog.measure.line import fit_line

FOLDER = Path(__file__).parents[1] / "reference" / "nist_strd" / "linear"


def read(name):
    """Certified (value, standard error) per coefficient, certified residual sd, and the data, response first."""
    lines = (FOLDER / f"{name}.dat").read_text(encoding="utf-8").splitlines()
    head = lines[:60]
    certified = [re.match(r"\s+B\d+\s+(\S+)\s+(\S+)", line) for line in head]
    values = np.array([[float(m[1]), float(m[2])] for m in certified if m])
    sd = next(
        float(line.split()[-1]) for line in head if "Standard Deviation " in line and line.split()[-1][0].isdigit()
    )
    first = next(i for i, line in enumerate(lines) if re.match(r"Data:\s+y", line)) + 1
    rows = np.array([[float(cell) for cell in line.split()] for line in lines[first:] if line.strip()])
    return values[:, 0], values[:, 1], sd, rows[:, 0], rows[:, 1:]


def digits(found, certified):
    """Agreeing significant digits, the least of all; leading zeros where the certified value is zero."""
    least = 16.0
    for a, b in zip(np.atleast_1d(found), np.atleast_1d(certified), strict=True):
        if a != b:
            least = min(least, -math.log10(abs((a - b) / b) if b else abs(a)))
    return least


def polynomial_about(centre, width, x, y, terms):
    """A polynomial fitted in (x − centre)/width, its coefficients turned exactly into those of x.

    Raw powers of x, each rounded to a double, have lost more digits than are asked for before any fit begins.
    """
    fit = least_squares(((x - centre) / width) ** np.arange(terms), y)
    turn = [
        [
            Fraction(math.comb(j, k)) * Fraction(-centre) ** (j - k) / Fraction(width) ** j if j >= k else Fraction(0)
            for j in range(terms)
        ]
        for k in range(terms)
    ]
    covariance = [[Fraction(float(cell)) for cell in row] for row in fit.covariance]
    value = [float(sum(t * Fraction(float(c)) for t, c in zip(row, fit.coefficient, strict=True))) for row in turn]
    se = [
        math.sqrt(sum(row[i] * covariance[i][j] * row[j] for i in range(terms) for j in range(terms))) for row in turn
    ]
    return value, se, fit.residual_sd


def test_norris_a_line_with_intercept_reaches_12_digits():
    values, errors, sd, y, x = read("Norris")
    fit = fit_line(x[:, 0], y)
    assert digits(fit.intercept_na, values[0]) > 12  # the difference of two numbers a thousand times larger
    assert digits(fit.slope_na_um, values[1]) > 14
    assert digits([fit.intercept_se_na, fit.slope_se_na_um], errors) > 13
    assert digits(fit.residual_sd_na, sd) > 13
    assert digits(fit.r_squared, 0.999993745883712) > 14


@pytest.mark.parametrize(("name", "r_squared"), [("NoInt1", 0.999365492298663), ("NoInt2", 0.993348115299335)])
def test_lines_through_zero_reach_14_digits(name, r_squared):
    values, errors, sd, y, x = read(name)
    fit = fit_line(x[:, 0], y, through_zero=True)
    assert digits(fit.slope_na_um, values) > 14
    assert digits(fit.slope_se_na_um, errors) > 14
    assert digits(fit.residual_sd_na, sd) > 14
    assert digits(fit.r_squared, r_squared) > 14


def test_longley_six_regressors_reach_12_digits():
    values, errors, sd, y, x = read("Longley")
    fit = least_squares(np.column_stack([np.ones(len(y)), x]), y)
    assert digits(fit.coefficient, values) > 12
    assert digits(fit.standard_error, errors) > 12
    assert digits(fit.residual_sd, sd) > 12


@pytest.mark.parametrize("name", ["Pontius", "Wampler1", "Wampler2", "Wampler3", "Wampler4", "Wampler5"])
def test_polynomials_in_raw_powers_reach_13_digits(name):
    values, errors, sd, y, x = read(name)
    fit = least_squares(x ** np.arange(len(values)), y)
    assert digits(fit.coefficient, values) > 13
    assert digits(fit.standard_error, errors) > 13
    assert digits(fit.residual_sd, sd) > 13


def test_filip_a_polynomial_of_degree_ten_reaches_13_digits():
    values, errors, sd, y, x = read("Filip")
    value, se, residual_sd = polynomial_about(-6, 2, x, y, 11)
    assert digits(value, values) > 13
    assert digits(se, errors) > 13
    assert digits(residual_sd, sd) > 13
