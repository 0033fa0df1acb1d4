"""Quantities as people type them, and numbers as people read them."""

from __future__ import annotations

import math

import pytest
from hypothesis import given
from hypothesis import strategies as st

from electrolog import units
from electrolog.errors import InputError
from electrolog.units import (
    CONCENTRATION_UM,
    CURRENT_NA,
    FRACTION,
    HOURS,
    LENGTH_UM,
    MINUTES,
    POTENTIAL_V,
    SCAN_RATE_V_S,
    SECONDS,
    SENSITIVITY_NA_UM,
    TEMPERATURE_C,
    Unit,
    parse_quantity,
    shown_span,
)

UNITS = {name: value for name, value in vars(units).items() if isinstance(value, Unit)}
LINEAR = {name: unit for name, unit in UNITS.items() if unit not in (MINUTES, SECONDS, HOURS)}


@pytest.mark.parametrize(
    ("text", "unit", "value"),
    [
        ("500nM", CONCENTRATION_UM, 0.5),
        ("0.5 uM", CONCENTRATION_UM, 0.5),
        ("0.5\u00b5M", CONCENTRATION_UM, 0.5),  # micro sign
        ("0.5\u03bcM", CONCENTRATION_UM, 0.5),  # Greek letter
        ("10mM", CONCENTRATION_UM, 10_000),
        ("0.1 M", CONCENTRATION_UM, 100_000),
        ("2", CONCENTRATION_UM, 2),
        ("5e-1", CONCENTRATION_UM, 0.5),
        (" .5 ", CONCENTRATION_UM, 0.5),
        ("5\u00a0nM", CONCENTRATION_UM, 0.005),
        ("800pA", CURRENT_NA, 0.8),
        ("-12.5 na", CURRENT_NA, -12.5),
        ("75um", LENGTH_UM, 75),
        ("0.1mm", LENGTH_UM, 100),
        ("-0.4 V", POTENTIAL_V, -0.4),
        ("\u22120.4 V", POTENTIAL_V, -0.4),  # minus sign
        ("\u2013400mV", POTENTIAL_V, -0.4),  # en dash
        ("400 V/s", SCAN_RATE_V_S, 400),
        ("37°C", TEMPERATURE_C, 37),
        ("70%", FRACTION, 0.7),
        ("12.4 nA / µM", SENSITIVITY_NA_UM, 12.4),
        ("12.4pA/nM", SENSITIVITY_NA_UM, 12.4),
        ("90min", MINUTES, 90),
        ("90", MINUTES, 90),
        ("4h", MINUTES, 240),
        ("4 Hours", MINUTES, 240),
        ("2h10min", MINUTES, 130),
        ("2h 10 m", MINUTES, 130),
        ("2h10", MINUTES, 130),
        ("1d2h", MINUTES, 1560),
        (".5h", MINUTES, 30),
        ("1h30m15s", MINUTES, 90.25),
        ("-4h", MINUTES, -240),
        ("30s", SECONDS, 30),
        ("2min", SECONDS, 120),
        ("3d", HOURS, 72),
    ],
)
def test_a_quantity_is_read_as_typed(text: str, unit: Unit, value: float) -> None:
    assert parse_quantity(text, unit) == pytest.approx(value, rel=1e-15)


@pytest.mark.parametrize(
    ("text", "unit"),
    [
        ("", CURRENT_NA),
        ("nM", CONCENTRATION_UM),
        ("abc", CURRENT_NA),
        ("nan", CURRENT_NA),
        ("NaN nA", CURRENT_NA),
        ("inf", CURRENT_NA),
        ("-Infinity", CURRENT_NA),
        ("1e999", CURRENT_NA),
        ("1e308M", CONCENTRATION_UM),
        ("9" * 400 + "h", MINUTES),
        ("5nA", CONCENTRATION_UM),
        ("5um", CURRENT_NA),
        ("5 furlongs", LENGTH_UM),
        ("98F", TEMPERATURE_C),
        ("1 2", CURRENT_NA),
        ("1_000", CURRENT_NA),
        ("1:30", MINUTES),
        ("2h2h", MINUTES),
        ("10min2h", MINUTES),
        ("2h-10min", MINUTES),
        ("5s3", MINUTES),
        ("--4h", MINUTES),
        ("1 month", MINUTES),
        ("5ms", SECONDS),
        ("3x", units.COUNT),
    ],
)
def test_what_is_no_quantity_of_the_column_is_refused(text: str, unit: Unit) -> None:
    with pytest.raises(InputError, match="this column") as refused:
        parse_quantity(text, unit, "this column")
    assert "\n" not in refused.value.message
    assert len(refused.value.message) < 400


@pytest.mark.parametrize(("text", "unit"), [("5m", CONCENTRATION_UM), ("5 MV", POTENTIAL_V), ("5MA", CURRENT_NA)])
def test_milli_is_never_taken_for_molar_or_mega(text: str, unit: Unit) -> None:
    with pytest.raises(InputError, match="has the unit"):
        parse_quantity(text, unit)


@pytest.mark.parametrize("text", ["0,5", "0,5uM", "2,5h"])
def test_a_decimal_comma_is_refused_with_what_to_write(text: str) -> None:
    with pytest.raises(InputError) as refused:
        parse_quantity(text, MINUTES if text.endswith("h") else CONCENTRATION_UM)
    assert "0.5" in refused.value.hint


@given(st.integers(1, 10**9))
def test_one_concentration_has_one_number_however_it_is_typed(picomolar: int) -> None:
    """Replicates are points at an equal concentration: 9 nM and 0.009 µM must be equal to the last bit."""
    as_um = f"{picomolar // 10**6}.{picomolar % 10**6:06d}uM"
    as_nm = f"{picomolar // 10**3}.{picomolar % 10**3:03d}nM"
    assert parse_quantity(f"{picomolar}pM", CONCENTRATION_UM) == parse_quantity(as_um, CONCENTRATION_UM)
    assert parse_quantity(as_nm, CONCENTRATION_UM) == parse_quantity(as_um, CONCENTRATION_UM)


@given(st.floats(allow_nan=False, allow_infinity=False), st.sampled_from(sorted(UNITS)))
def test_a_bare_number_comes_back_as_it_was(value: float, name: str) -> None:
    assert parse_quantity(repr(value), UNITS[name]) == value


@given(st.floats(1e-6, 1e6), st.sampled_from(sorted(LINEAR)), st.data())
def test_a_sign_scales_by_its_factor(value: float, name: str, data: st.DataObject) -> None:
    unit = LINEAR[name]
    if unit.factors:
        sign = data.draw(st.sampled_from(sorted(unit.factors)))
        assert parse_quantity(f"{value!r} {sign}", unit) == pytest.approx(value * unit.factors[sign], rel=1e-15)


@given(st.integers(0, 99), st.integers(0, 23), st.integers(0, 59), st.integers(0, 59))
def test_compound_durations_add_up(days: int, hours: int, minutes: int, seconds: int) -> None:
    typed = f"{days}d{hours}h{minutes}min{seconds}s"
    expected = days * 86400 + hours * 3600 + minutes * 60 + seconds
    assert parse_quantity(typed, SECONDS) == pytest.approx(expected, abs=1e-9)
    assert parse_quantity(typed, MINUTES) == pytest.approx(expected / 60, abs=1e-9)


@given(st.text(max_size=30), st.sampled_from(sorted(UNITS)))
def test_any_text_is_a_finite_number_or_refused(text: str, name: str) -> None:
    try:
        value = parse_quantity(text, UNITS[name])
    except InputError:
        return
    assert math.isfinite(value)


def test_each_units_example_can_be_typed() -> None:
    examples = [(unit, text) for unit in UNITS.values() for text in unit.example.split(", ")]
    assert all(math.isfinite(parse_quantity(text, unit)) for unit, text in examples)


@pytest.mark.parametrize(
    ("value", "shown"),
    [(None, "?"), (math.nan, "?"), (0.0, "0"), (12.345, "12.3"), (123456.0, "123000"), (1e-7, "1.00e-07")],
)
def test_a_number_is_shown_with_the_digits_it_deserves(value: float | None, shown: str) -> None:
    assert units.shown_number(value) == shown


@pytest.mark.parametrize(
    ("um", "shown"), [(None, "?"), (0.0255, "25.5 nM"), (0.5, "0.5 µM"), (10_000, "10 mM"), (0, "0 µM")]
)
def test_a_concentration_is_shown_in_the_unit_people_use(um: float | None, shown: str) -> None:
    assert units.shown_concentration(um) == shown


@pytest.mark.parametrize(
    ("minutes", "shown"), [(None, "?"), (0, "0 min"), (0.25, "0.25 min"), (90, "1 h 30 min"), (240, "4 h")]
)
def test_a_duration_is_shown_in_hours_and_minutes(minutes: float | None, shown: str) -> None:
    assert units.shown_duration(minutes) == shown


@pytest.mark.parametrize(
    ("share", "shown"), [(None, "?"), (0.0, "0 %"), (0.004, "<1 %"), (0.5, "50 %"), (0.9996, ">99 %"), (1.0, "100 %")]
)
def test_a_share_is_never_rounded_to_a_certainty(share: float | None, shown: str) -> None:
    assert units.shown_percent(share) == shown


@pytest.mark.parametrize(
    ("low", "high", "said"),
    [
        (9.98, 10.83, "9.98 to 10.8"),
        (11.978, 12.026, "11.98 to 12.03"),
        (0.5, 0.5, "0.5 to 0.5"),
        (2.0, math.inf, "2 to inf"),
    ],
)
def test_a_spans_ends_are_told_apart(low: float, high: float, said: str) -> None:
    assert shown_span(low, high) == said
