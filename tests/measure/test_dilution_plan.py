import pytest
from hypothesis import given
from hypothesis import strategies as st

from electrolog.errors import InputError
from electrolog.measure.dilution_plan import plan_dilutions


def test_a_weak_stock_is_pipetted_at_once():
    plan = plan_dilutions(100.0, volume_ml=50)
    assert plan.intermediate is None
    assert [step.take_ml for step in plan.steps] == pytest.approx([0.125, 0.25, 0.5, 1.0])
    assert [step.diluent_ml for step in plan.steps] == pytest.approx([49.875, 49.75, 49.5, 49.0])


def test_a_strong_stock_goes_through_an_intermediate():
    plan = plan_dilutions(10_000.0, volume_ml=50)
    assert plan.intermediate is not None
    assert plan.intermediate.take_ml >= 0.01
    assert plan.intermediate.make_up_to_ml >= sum(step.take_ml for step in plan.steps)
    assert min(step.take_ml for step in plan.steps) >= 0.01


@given(
    st.floats(5, 20_000),
    st.lists(st.floats(0.05, 5), min_size=1, max_size=6),
    st.sampled_from([5.0, 20.0, 50.0, 100.0]),
)
def test_what_is_pipetted_gives_what_is_wanted(stock_um, wanted_um, volume_ml):
    plan = plan_dilutions(stock_um, wanted_um, volume_ml=volume_ml)
    source_um = stock_um
    if plan.intermediate is not None:
        source_um = stock_um * plan.intermediate.take_ml / plan.intermediate.make_up_to_ml
        assert plan.intermediate.concentration_um == pytest.approx(source_um)
    for step, wanted in zip(plan.steps, wanted_um, strict=True):
        assert source_um * step.take_ml / step.make_up_to_ml == pytest.approx(wanted)
        assert step.take_ml * (1 + 1e-9) >= 0.01
        assert step.diluent_ml >= -1e-9


def test_what_cannot_be_made_is_refused():
    with pytest.raises(InputError, match="can't be made from a stock of 1 µM"):
        plan_dilutions(1.0, [2.0])
    with pytest.raises(InputError, match="above zero"):
        plan_dilutions(100.0, [0.0])
    with pytest.raises(InputError, match="no single intermediate"):
        plan_dilutions(1e6, [1e-6, 1e5])


def test_a_stock_a_little_too_strong_is_diluted_a_little():
    plan = plan_dilutions(30.0, [0.05, 5.0], volume_ml=5)
    assert plan.intermediate is not None
    assert plan.intermediate.concentration_um == 15.0


FLASKS_ML = (1, 2, 5, 10, 20, 25, 50, 100, 200, 250, 500, 1000)  # of those that ISO 1042 names, from memory


@pytest.mark.parametrize(
    ("stock_um", "wanted_um", "volume_ml", "flask_ml"),
    [
        (1e6, (0.25, 0.5, 1.0, 2.0), 50.0, 10.0),  # 0.01 mL at a thousandth fills just that one
        (1000.0, (0.0011, 22.0), 1000.0, 250.0),
        (10_000.0, (0.25, 0.5, 1.0, 2.0), 50.0, 1.0),
    ],
)
def test_the_intermediate_is_made_in_the_smallest_flask_that_holds_it(stock_um, wanted_um, volume_ml, flask_ml):
    plan = plan_dilutions(stock_um, wanted_um, volume_ml=volume_ml)
    assert plan.intermediate.make_up_to_ml == flask_ml
    factor = plan.intermediate.make_up_to_ml / plan.intermediate.take_ml
    needed = max(sum(step.take_ml for step in plan.steps), 0.01 * factor)
    assert flask_ml == min(size for size in FLASKS_ML if size >= needed * (1 - 1e-9))
