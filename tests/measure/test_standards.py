import math

import numpy as np
import pytest

from electrolog.errors import InputError
from electrolog.measure.standards import Dilution, Measured, diluted, from_tolerance, prepared

DOPAMINE_HCL_G_MOL = 189.639


def test_a_weighed_salt():
    """18.9639 mg of dopamine hydrochloride in 100 mL is 1 mM, by its molar mass."""
    stock = prepared(Measured(18.9639), DOPAMINE_HCL_G_MOL, Measured(100.0))
    assert stock.concentration_um == pytest.approx(1000, rel=1e-12)
    assert stock.relative_uncertainty == 0
    assert stock.budget == ()


def test_cadmium_calibration_standard():
    """EURACHEM/CITAC CG 4, example A1: 100.28 mg, purity 0.9999 in 100 mL: 1002.7 mg/L with u = 0.9 (from memory)."""
    molar_mass_g_mol = 112.414
    stock = prepared(
        Measured(100.28, 0.05), molar_mass_g_mol, Measured(100.0, 0.07), purity=from_tolerance(0.9999, 0.0001)
    )
    mg_per_l = molar_mass_g_mol / 1000
    assert round(stock.concentration_um * mg_per_l, 1) == 1002.7
    assert round(stock.uncertainty_um * mg_per_l, 1) == 0.9
    assert [name for name, _ in stock.budget] == ["volume of the stock", "mass", "purity"]
    assert sum(share for _, share in stock.budget) == pytest.approx(1)


def test_tolerances_become_standard_uncertainties():
    """JCGM 100:2008 (GUM) 4.3.7 and 4.3.9: rectangular a/√3, triangular a/√6."""
    assert from_tolerance(100, 0.1).uncertainty == pytest.approx(0.1 / math.sqrt(3))
    assert from_tolerance(100, 0.1, triangular=True).uncertainty == pytest.approx(0.1 / math.sqrt(6))


def test_a_chain_of_dilutions_agrees_with_simulation():
    random, tries = np.random.default_rng(7), 200_000
    chain = [Dilution(Measured(1, 0.01), Measured(100, 0.1)), Dilution(Measured(0.5, 0.008), Measured(50, 0.06))]
    working = prepared(
        Measured(19, 0.1), DOPAMINE_HCL_G_MOL, Measured(10, 0.02), purity=Measured(0.985, 0.005), dilutions=chain
    )

    def drawn(value, uncertainty):
        return random.normal(value, uncertainty, tries)

    simulated = drawn(19, 0.1) / DOPAMINE_HCL_G_MOL * drawn(0.985, 0.005) / drawn(10, 0.02) * 1e6
    simulated *= drawn(1, 0.01) / drawn(100, 0.1) * drawn(0.5, 0.008) / drawn(50, 0.06)
    assert working.concentration_um == pytest.approx(simulated.mean(), rel=1e-3)
    assert working.relative_uncertainty == pytest.approx(simulated.std() / simulated.mean(), rel=0.01)
    assert working.budget[0][0] == "dilution 2, taken"


def test_diluting_a_known_standard_is_the_same_as_the_whole_chain():
    step = Dilution(Measured(1, 0.01), Measured(100, 0.1))
    stock = prepared(Measured(19, 0.1), DOPAMINE_HCL_G_MOL, Measured(10, 0.02))
    later, at_once = (
        diluted(stock, step),
        prepared(Measured(19, 0.1), DOPAMINE_HCL_G_MOL, Measured(10, 0.02), dilutions=[step]),
    )
    assert later.concentration_um == pytest.approx(at_once.concentration_um)
    assert later.relative_uncertainty == pytest.approx(at_once.relative_uncertainty)
    assert later.budget[0] == ("dilution 1, taken", pytest.approx(at_once.budget[0][1]))


@pytest.mark.parametrize("value", [0.0, -1.0, float("nan")])
def test_what_was_measured_must_be_above_zero(value):
    with pytest.raises(InputError, match="above zero"):
        Measured(value)


def test_impossible_preparations_are_refused():
    with pytest.raises(InputError, match=r"98 % is 0\.98"):
        prepared(Measured(19), DOPAMINE_HCL_G_MOL, Measured(10), purity=Measured(98))
    with pytest.raises(InputError, match="second volume"):
        Dilution(Measured(100), Measured(1))
    with pytest.raises(InputError, match="zero or more"):
        Measured(1, -0.1)
