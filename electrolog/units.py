"""Numbers as people type them at the bench, turned into the one unit their column is kept in."""

from __future__ import annotations

import math
import re
from dataclasses import dataclass
from decimal import Decimal

from electrolog.errors import InputError, shortened

# The micro sign (U+00B5) and the Greek letter (U+03BC) look alike and are both typed; keyboards without either
# give "u". Signs pasted from a paper bring their own minus.
_FOLD = str.maketrans({"\u00b5": "u", "\u03bc": "u", "\u2212": "-", "\u2013": "-", "\u00a0": " ", "\u202f": " "})
_NUMBER = re.compile(r"([+-]?(?:\d+\.?\d*|\.\d+)(?:e[+-]?\d+)?)\s*(.*)", re.IGNORECASE | re.DOTALL)
_CLOCK_PARTS = re.compile(r"(\d+\.?\d*|\.\d+)\s*([a-z]+)?\s*", re.IGNORECASE)


@dataclass(frozen=True)
class Unit:
    """A column's unit: its sign, and every sign that is accepted with its factor into it.

    Signs are read whatever their case, but for a first m or M: milli and molar or mega are a world apart.
    """

    sign: str
    factors: dict[str, float]
    example: str


CONCENTRATION_UM = Unit("µM", {"fM": 1e-9, "pM": 1e-6, "nM": 1e-3, "uM": 1.0, "mM": 1e3, "M": 1e6}, "500nM, 0.5uM")
CURRENT_NA = Unit("nA", {"pA": 1e-3, "nA": 1.0, "uA": 1e3, "mA": 1e6}, "12.5nA, 800pA")
LENGTH_UM = Unit("µm", {"nm": 1e-3, "um": 1.0, "mm": 1e3}, "75um, 0.1mm")
POTENTIAL_V = Unit("V", {"mV": 1e-3, "V": 1.0}, "0.6V, -400mV")
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
SCAN_RATE_V_S = Unit("V/s", {"V/s": 1.0, "mV/s": 1e-3, "kV/s": 1e3}, "400V/s")
FREQUENCY_HZ = Unit("Hz", {"Hz": 1.0, "kHz": 1e3}, "10Hz")
TEMPERATURE_C = Unit("°C", {"C": 1.0, "°C": 1.0, "degC": 1.0}, "37C")
WEIGHT_PERCENT = Unit("wt%", {"%": 1.0, "wt%": 1.0}, "5%")
FRACTION = Unit("", {"%": 0.01}, "0.7, 70%")
SENSITIVITY_NA_UM = Unit("nA/µM", {"nA/uM": 1.0, "pA/nM": 1.0, "nA/nM": 1e3, "pA/uM": 1e-3, "nA/mM": 1e-3}, "12.5nA/uM")
MOLAR_MASS_G_MOL = Unit("g/mol", {"g/mol": 1.0, "kg/mol": 1e3}, "153.18g/mol")
MASS_MG = Unit("mg", {"ug": 1e-3, "mg": 1.0, "g": 1e3}, "18.96mg, 0.5g")
VOLUME_ML = Unit("mL", {"ul": 1e-3, "ml": 1.0, "l": 1e3}, "10mL, 50uL, 1L")
COUNT = Unit("", {}, "3")
PLAIN = Unit("", {}, "0.95")


def parse_quantity(text: str, unit: Unit, what: str = "value") -> float:
    """The number of `text` in `unit`; a bare number is already in it.

    Raises InputError when there is no finite number, or a unit that doesn't belong to this column.
    """
    folded = text.translate(_FOLD).strip()
    match = _NUMBER.fullmatch(folded)
    duration = unit in (MINUTES, SECONDS, HOURS)
    if match and (not duration or _known_sign(match[2], unit) is not None):
        sign = _known_sign(match[2], unit)
        if sign is None:
            raise _wrong_unit(text, match[2], unit, what)
        return _scaled(match[1], unit.factors[sign] if sign else 1.0, text, what)
    if duration:
        return _parse_compound(folded, unit, text, what)
    raise _not_a_number(text, unit, what)


def _known_sign(typed: str, unit: Unit) -> str | None:
    """The unit's own spelling of a typed sign; '' for none, None for one that doesn't belong here."""
    sign = "".join(typed.split())
    if sign in unit.factors or not sign:
        return sign
    same = (known for known in unit.factors if known.casefold() == sign.casefold())
    milli_or_mega = sign[0] in "mM" and unit not in (MINUTES, SECONDS, HOURS)
    return next((known for known in same if not milli_or_mega or known[0] == sign[0]), None)


def _scaled(number: str, factor: float, text: str, what: str) -> float:
    """In decimals, so that `9nM` and `0.009uM` are one concentration: 9 * 1e-3 in binary is another number."""
    value = float(number)
    if math.isfinite(value) and factor != 1.0:
        value = float(Decimal(number) * Decimal(repr(factor)))
    if not math.isfinite(value):
        raise InputError(f"{what}: '{shortened(text)}' is too large a number")
    return value


def _parse_compound(folded: str, unit: Unit, text: str, what: str) -> float:
    """`2h10min`: each part smaller than the one before; a last part without a sign takes the next smaller (`2h10`)."""
    negative = folded.startswith("-")
    rest = folded.removeprefix("-").removeprefix("+")
    parts = _CLOCK_PARTS.findall(rest)
    if not parts or "".join(n + s for n, s in parts) != re.sub(r"\s+", "", rest):
        raise _not_a_number(text, unit, what)
    total, smaller, before = 0.0, "", math.inf
    for number, raw_sign in parts:
        sign = raw_sign.casefold() or smaller
        if sign and sign not in unit.factors:
            raise _wrong_unit(text, raw_sign, unit, what)
        if not sign or unit.factors[sign] >= before:
            raise _not_a_number(text, unit, what)
        before = unit.factors[sign]
        total += _scaled(number, before, text, what)
        smaller = {"d": "h", "h": "min", "m": "s"}.get(sign[0], "")
    return -total if negative else total


def _not_a_number(text: str, unit: Unit, what: str) -> InputError:
    in_unit = f" in {unit.sign}" if unit.sign else ""
    return InputError(
        f"{what}: '{shortened(text)}' is not a number; accepted: a number{in_unit}, such as {unit.example}", _hint(text)
    )


def _hint(text: str) -> str:
    return "a decimal comma isn't read: write 0.5 for a half" if re.search(r"\d,\d", text) else ""


def _wrong_unit(text: str, sign: str, unit: Unit, what: str) -> InputError:
    if "".join(sign.split())[0] in ",._:'0123456789":  # no unit, but more of a number
        return _not_a_number(text, unit, what)
    accepted = "a bare number"
    if unit.factors:
        accepted = f"{', '.join(list(unit.factors)[:6])} (a bare number is in {unit.sign or 'parts of 1'})"
    typed = f"'{shortened(text)}' has the unit '{shortened(sign, 20)}'"
    return InputError(f"{what}: {typed}; accepted: {accepted}, such as {unit.example}")


def counted(number: int, one: str, many: str = "") -> str:
    """`1 point`, `7 points`, `2 batches`."""
    return f"{number} {one if number == 1 else many or one + 's'}"


def shown_number(value: float | None, digits: int = 3) -> str:
    """A number for a person: `digits` significant ones, without an exponent in the range a bench uses."""
    if value is None or math.isnan(value):
        return "?"
    if value == 0 or 1e-4 <= abs(value) < 1e6:
        text = f"{value:.{digits}g}"
        return f"{float(text):.0f}" if "e" in text else text
    return f"{value:.{digits - 1}e}"


def shown_span(low: float, high: float, digits: int = 3) -> str:
    """`11.98 to 12.03`: with as many digits as tell the two ends apart, since '12 to 12' would claim no error."""
    for more in range(digits, digits + 4):
        if low == high or shown_number(low, more) != shown_number(high, more):
            break
    return f"{shown_number(low, more)} to {shown_number(high, more)}"


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
