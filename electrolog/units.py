"""Numbers as people type them at the bench, turned into the one unit their column is kept in."""

from __future__ import annotations

import math
import re
from dataclasses import dataclass

from electrolog.errors import InputError, shortened

# The micro sign (U+00B5) and the Greek letter (U+03BC) look alike and are both typed; keyboards without either
# give "u". Signs pasted from a paper bring their own minus.
_FOLD = str.maketrans({"\u00b5": "u", "\u03bc": "u", "\u2212": "-", "\u2013": "-", "\u00a0": " ", "\u202f": " "})
_NUMBER = re.compile(r"([+-]?(?:\d+\.?\d*|\.\d+)(?:e[+-]?\d+)?)\s*(.*)", re.IGNORECASE | re.DOTALL)
_CLOCK_PARTS = re.compile(r"(\d+(?:\.\d+)?)\s*([a-z]+)?\s*", re.IGNORECASE)


@dataclass(frozen=True)
class Unit:
    """A column's unit: its sign, and every other sign that is accepted with its factor into it."""

    sign: str
    factors: dict[str, float]
    example: str


CONCENTRATION_UM = Unit("µM", {"fm": 1e-9, "pm": 1e-6, "nm": 1e-3, "um": 1.0, "mm": 1e3, "m": 1e6}, "500nM, 0.5uM")
CURRENT_NA = Unit("nA", {"pa": 1e-3, "na": 1.0, "ua": 1e3, "ma": 1e6}, "12.5nA, 800pA")
LENGTH_UM = Unit("µm", {"nm": 1e-3, "um": 1.0, "mm": 1e3}, "75um, 0.1mm")
POTENTIAL_V = Unit("V", {"mv": 1e-3, "v": 1.0}, "0.6V, -400mV")
MINUTES = Unit(
    "min",
    {
        **dict.fromkeys(("s", "sec", "secs"), 1 / 60),
        **dict.fromkeys(("min", "mins", "m", "minutes", "minute"), 1.0),
        **dict.fromkeys(("h", "hr", "hrs", "hour", "hours"), 60.0),
        **dict.fromkeys(("d", "day", "days"), 1440.0),
    },
    "90min, 4h, 2h10min",
)
SECONDS = Unit("s", {sign: factor * 60 for sign, factor in MINUTES.factors.items()}, "30s, 2min")
HOURS = Unit("h", {sign: factor / 60 for sign, factor in MINUTES.factors.items()}, "24h, 3d")
SCAN_RATE_V_S = Unit("V/s", {"v/s": 1.0, "mv/s": 1e-3, "kv/s": 1e3}, "400V/s")
FREQUENCY_HZ = Unit("Hz", {"hz": 1.0, "khz": 1e3}, "10Hz")
TEMPERATURE_C = Unit("°C", {"c": 1.0, "°c": 1.0, "degc": 1.0}, "37C")
WEIGHT_PERCENT = Unit("wt%", {"%": 1.0, "wt%": 1.0}, "5%")
FRACTION = Unit("", {"%": 0.01}, "0.7, 70%")
SENSITIVITY_NA_UM = Unit("nA/µM", {"na/um": 1.0, "pa/nm": 1.0, "na/nm": 1e3, "pa/um": 1e-3, "na/mm": 1e-3}, "12.5nA/uM")
MOLAR_MASS_G_MOL = Unit("g/mol", {"g/mol": 1.0, "kg/mol": 1e3}, "153.18g/mol")
COUNT = Unit("", {}, "3")
PLAIN = Unit("", {}, "0.95")


def parse_quantity(text: str, unit: Unit, what: str = "value") -> float:
    """The number of `text` in `unit`; a bare number is already in it.

    Raises InputError when there is no finite number, or a unit that doesn't belong to this column.
    """
    folded = text.translate(_FOLD).strip()
    if unit in (MINUTES, SECONDS, HOURS):
        return _parse_duration(folded, unit, text, what)
    match = _NUMBER.fullmatch(folded)
    if match is None:
        raise _not_a_number(text, unit, what)
    sign = match[2].strip().casefold()
    if sign and sign not in unit.factors:
        raise _wrong_unit(text, sign, unit, what)
    return _finite(float(match[1]) * unit.factors.get(sign, 1.0), text, unit, what)


def _parse_duration(folded: str, unit: Unit, text: str, what: str) -> float:
    """Durations may be compound, `2h10min`; a last part without a sign takes the next smaller one (`2h10`)."""
    negative = folded.startswith("-")
    rest = folded.removeprefix("-").removeprefix("+")
    plain = _NUMBER.fullmatch(rest)
    if plain and not plain[2].strip():
        value = float(plain[1])
        return _finite(-value if negative else value, text, unit, what)
    parts = _CLOCK_PARTS.findall(rest)
    if not parts or "".join(n + s for n, s in parts) != re.sub(r"\s+", "", rest):
        raise _not_a_number(text, unit, what)
    total, smaller = 0.0, ""
    for number, raw_sign in parts:
        sign = raw_sign.casefold() or smaller
        if sign not in unit.factors:
            raise _wrong_unit(text, raw_sign, unit, what)
        total += float(number) * unit.factors[sign]
        smaller = {"d": "h", "h": "min", "m": "s"}.get(sign[0], "")
    return _finite(-total if negative else total, text, unit, what)


def _finite(value: float, text: str, unit: Unit, what: str) -> float:
    if not math.isfinite(value):
        raise _not_a_number(text, unit, what)
    return value


def _not_a_number(text: str, unit: Unit, what: str) -> InputError:
    hint = "a decimal comma isn't read: write 0.5 for a half" if re.search(r"\d,\d", text) else ""
    in_unit = f" in {unit.sign}" if unit.sign else ""
    return InputError(
        f"{what}: '{shortened(text)}' is not a number; accepted: a number{in_unit}, such as {unit.example}", hint
    )


def _wrong_unit(text: str, sign: str, unit: Unit, what: str) -> InputError:
    if not unit.factors:
        accepted = "a bare number"
    else:
        accepted = f"{', '.join(list(unit.factors)[:6])} (a bare number is in {unit.sign or 'parts of 1'})"
    return InputError(
        f"{what}: '{shortened(text)}' has the unit '{shortened(sign, 20)}'; accepted: {accepted}, such as {unit.example}"
    )


def shown_number(value: float | None, digits: int = 3) -> str:
    """A number for a person: `digits` significant ones, without an exponent in the range a bench uses."""
    if value is None or math.isnan(value):
        return "?"
    if value == 0 or 1e-4 <= abs(value) < 1e6:
        text = f"{value:.{digits}g}"
        return f"{float(text):.0f}" if "e" in text else text
    return f"{value:.{digits - 1}e}"


def shown_concentration(value_um: float | None, digits: int = 3) -> str:
    if value_um is None or math.isnan(value_um):
        return "?"
    if value_um != 0 and abs(value_um) < 0.1:
        return f"{shown_number(value_um * 1e3, digits)} nM"
    if abs(value_um) >= 1e3:
        return f"{shown_number(value_um / 1e3, digits)} mM"
    return f"{shown_number(value_um, digits)} µM"


def shown_duration(minutes: float | None) -> str:
    """Minutes as hours and minutes: 130 -> '2 h 10 min'."""
    if minutes is None or math.isnan(minutes):
        return "?"
    whole = round(minutes)
    hours, rest = divmod(whole, 60)
    if hours == 0:
        return f"{rest} min" if whole or minutes == 0 else f"{minutes:.2g} min"
    return f"{hours} h {rest} min" if rest else f"{hours} h"


def shown_percent(fraction: float | None) -> str:
    """A share as percent, never rounded up to a certainty it isn't: 0.9996 -> '>99 %'."""
    if fraction is None or math.isnan(fraction):
        return "?"
    if 0 < fraction < 0.01:
        return "<1 %"
    if 0.99 < fraction < 1:
        return ">99 %"
    return f"{fraction * 100:.0f} %"
