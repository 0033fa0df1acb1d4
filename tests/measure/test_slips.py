"""A slip is asked about; an honest calibration isn't."""

import pytest

from electrolog.measure.slips import likely_slips, reversed_order

X, Y = [0, 0.25, 0.5, 1, 2], [0.1, 5, 10.3, 19.8, 40.2]
EARLIER = [18.0, 22.0, 25.0]
BEFORE_UM = [0.5, 1, 2]


def slips(sensitivity, x=X, y=Y, earlier=EARLIER, before_um=BEFORE_UM):
    return likely_slips(x, y, sensitivity, earlier_sensitivity_na_um=earlier, earlier_concentration_um=before_um)


@pytest.mark.parametrize("sensitivity", [20.0, 9.0, 45.0, 4.0])
def test_an_honest_calibration_is_not_questioned(sensitivity):
    assert slips(sensitivity) == ()


def test_without_a_past_the_size_is_not_questioned():
    assert slips(0.02, earlier=[], before_um=[]) == ()


@pytest.mark.parametrize(("sensitivity", "times"), [(0.02, "1/1100 of"), (21000.0, "955 times")])
def test_a_thousandfold_is_questioned(sensitivity, times):
    (said,) = slips(sensitivity)
    assert times in said
    assert "usual 22 nA/µM" in said
    assert "1000" in said


@pytest.mark.parametrize("sensitivity", [2.2, 220.0, 0.22, 2200.0])
def test_a_slipped_decimal_is_questioned(sensitivity):
    (said,) = slips(sensitivity)
    assert "decimal" in said


def test_an_inverse_factor_is_questioned():
    said = slips(1 / 5.0, x=[], y=[], earlier=[4.8, 5.2])
    assert len(said) == 1
    assert "inverse" in said[0]
    assert "µM/nA" in said[0]


def test_near_one_a_factor_and_its_inverse_are_not_told_apart():
    assert slips(1 / 1.2, x=[], y=[], earlier=[1.2]) == ()


def test_nanomolar_typed_as_micromolar_is_questioned():
    said = slips(20.0, x=[0, 250, 500, 1000, 2000])
    assert len(said) == 1
    assert "2000 µM, and 2 µM at most before: 1000 times; nM typed as µM" in said[0]
    assert "µM typed as nM" in slips(20.0, x=[0, 0.00025, 0.0005, 0.001, 0.002])[0]


def test_a_wider_range_alone_is_not_questioned():
    assert slips(20.0, x=[0, 2.5, 5, 10, 20]) == ()


def test_negative_oxidation_is_questioned_once():
    (said,) = slips(-20.0, y=[-value for value in Y])
    assert "oxidation recorded as negative" in said


def test_swapped_points_are_questioned():
    (said,) = slips(20.0, y=[0.1, 5, 19.8, 10.3, 40.2])
    assert "19.8 nA at 0.5 µM to 10.3 nA at 1 µM" in said


def test_swapped_points_are_found_in_negative_currents_too():
    said = slips(-20.0, y=[-0.1, -5, -19.8, -10.3, -40.2])
    assert any("-19.8 nA at 0.5 µM to -10.3 nA at 1 µM" in text for text in said)


def test_scatter_may_reverse_the_order():
    assert reversed_order([0, 1, 1, 2, 2], [0, 20, 24, 18, 21]) is None  # replicates 3 and 4 nA apart
    assert reversed_order([0, 1, 2], [0, 10.0, 9.8]) is None  # within 5 %
    assert reversed_order([0, 1, 2], [0, 10.0, 8.0]) is not None
    assert reversed_order([0, 1, 2], [0, 10.0, 8.0], noise_na=1.0) is None
    assert reversed_order([0, 1, 1, 2, 2], [0, 20, 20.2, 10, 10.2]) is not None
    assert reversed_order([0, 1, 1, 2, 2], [0, 20, 20, 19.8, 19.8]) is None  # alike by rounding, not by precision
    assert reversed_order([1], [10]) is None
