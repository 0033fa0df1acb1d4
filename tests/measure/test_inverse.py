"""From a current back to a concentration, against published examples."""

import numpy as np
import pytest

from electrolog.errors import InputError
from electrolog.measure.inverse import predict_concentration
from electrolog.measure.line import fit_line
from electrolog.measure.weights import from_sd


@pytest.mark.parametrize(
    ("y0", "replicates", "x0", "se", "half"),
    [
        (2.9, 1, 0.72, 0.26, 0.68),
        (13.5, 1, 6.21, 0.24, 0.62),
        (23.0, 1, 11.13, 0.26, 0.68),
        (13.5, 4, 6.21, 0.14, 0.36),
    ],
)
def test_fluorescein(y0, replicates, x0, se, half):
    """Miller & Miller, ch. 5 (published roundings from memory)."""
    fit = fit_line([0, 2, 4, 6, 8, 10, 12], [2.1, 5.0, 9.0, 12.6, 17.3, 21.0, 24.7])
    found = predict_concentration(fit, y0, replicates)
    assert round(found.concentration_um, 2) == x0
    assert round(found.se_um, 2) == se
    assert round((found.delta_um[1] - found.delta_um[0]) / 2, 2) == half


def test_cadmium_released_from_ceramic_ware():
    """EURACHEM/CITAC CG 4, example A5: two absorbances give 0.260 mg/L with u = 0.018."""
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
    fit = fit_line(np.repeat([0.1, 0.3, 0.5, 0.7, 0.9], 3), absorbance)
    found = predict_concentration(fit, (0.0712 + 0.0716) / 2, 2)
    assert (round(found.concentration_um, 3), round(found.se_um, 3)) == (0.260, 0.018)


def test_open_textbook_example():
    """Harvey, Analytical Chemistry 2.1, example 5.11: 0.241 with s = 0.0024 from three replicates."""
    fit = fit_line([0, 0.1, 0.2, 0.3, 0.4, 0.5], [0, 12.36, 24.83, 35.91, 48.79, 60.42])
    found = predict_concentration(fit, (29.32 + 29.16 + 29.51) / 3, 3)
    assert (round(found.concentration_um, 3), round(found.se_um, 4)) == (0.241, 0.0024)
    assert round((found.delta_um[1] - found.delta_um[0]) / 2, 3) == 0.007


def test_fieller_interval_of_arsenic(arsenic):
    """Greenwell & Schubert Kabban, R Journal 6(1) 2014: 2.9314 (2.6035, 3.2587), from memory; level 0.90 inferred."""
    found = predict_concentration(fit_line(*arsenic), 3.0, confidence=0.90)
    assert [round(value, 4) for value in (found.concentration_um, *found.fieller_um)] == [2.9314, 2.6035, 3.2587]


def test_fieller_interval_of_cadmium(cadmium):
    """Millard & Neerchal (2001), pp. 566-575: 59.97301 (53.8301, 66.15422) at 99 %."""
    found = predict_concentration(fit_line(*cadmium), 60.0, confidence=0.99)
    assert round(found.concentration_um, 5) == 59.97301
    assert [round(value, 5) for value in found.fieller_um] == [53.8301, 66.15422]


@pytest.mark.parametrize(("y0", "w0", "x0", "se"), [(0.100, 1.8, 1.23, 0.0322), (0.600, 0.044, 8.01, 0.1970)])
def test_weighted_line(y0, w0, x0, se):
    """Miller & Miller, ch. 5: values from memory; the standard errors recomputed, as the remembered ones don't fit."""
    x, y = [0, 2, 4, 6, 8, 10], [0.009, 0.158, 0.301, 0.472, 0.577, 0.739]
    fit = fit_line(x, y, weights=from_sd([0.001, 0.004, 0.010, 0.013, 0.017, 0.022]))
    found = predict_concentration(fit, y0, weight=w0)
    assert round(found.concentration_um, 2) == x0
    assert found.se_um == pytest.approx(se, abs=5e-5)


def test_the_intervals_hold_what_they_promise():
    """Of 4000 simulated unknowns, the exact (Fieller) interval holds 90 % of the truths even on a poor line."""
    random = np.random.default_rng(8)
    x, held, told = np.array([0, 0.5, 1, 2.0]), 0, 0
    for _ in range(4000):
        fit = fit_line(x, 20 * x + random.normal(0, 3, 4))
        found = predict_concentration(fit, 20 * 1.4 + random.normal(0, 3), confidence=0.90)
        told += found.fieller_um is not None
        held += found.fieller_um is not None and found.fieller_um[0] <= 1.4 <= found.fieller_um[1]
    assert told > 3900
    assert held / told == pytest.approx(0.90, abs=0.015)


def test_delta_and_fieller_agree_on_a_good_line():
    x = np.linspace(0, 2, 9)
    fit = fit_line(x, 20 * x + 0.01 * np.array([1, -1, 2, -2, 1, 0, -1, 1, -1]))
    found = predict_concentration(fit, 17.0)
    assert found.delta_um == pytest.approx(found.fieller_um, rel=1e-6)


def test_more_replicates_narrow_the_interval():
    fit = fit_line([0, 0.5, 1, 2], [0.4, 9.1, 21, 39])
    one, nine = predict_concentration(fit, 15, 1), predict_concentration(fit, 15, 9)
    assert nine.se_um < one.se_um
    assert nine.concentration_um == one.concentration_um


def test_no_interval_without_a_slope():
    found = predict_concentration(fit_line([0, 1, 2, 3], [1, 3, -2, 1]), 2.0)
    assert (found.concentration_um, found.se_um, found.delta_um, found.fieller_um) == (None,) * 4
    assert "can't be told from zero" in found.why_not


def test_two_points_give_a_value_and_no_interval():
    found = predict_concentration(fit_line([0, 1], [0, 20]), 5.0)
    assert found.concentration_um == 0.25
    assert found.fieller_um is None
    assert "no degree of freedom" in found.why_not


def test_what_cannot_be_predicted_from_is_refused():
    fit = fit_line([0, 0.5, 1, 2], [0.4, 9.1, 21, 39])
    for bad in ({"replicates": 0}, {"confidence": 1.0}, {"weight": 0.0}):
        with pytest.raises(InputError):
            predict_concentration(fit, 5.0, **bad)
    with pytest.raises(InputError):
        predict_concentration(fit, float("nan"))
