"""What a heading means: a field, the unit in it, a concentration, before or after the run; with the reason."""

from __future__ import annotations

import re
from dataclasses import dataclass, replace
from functools import lru_cache

from electrolog import units
from electrolog.errors import InputError, unknown
from electrolog.record.books.fields import FIELDS
from electrolog.record.builtin import ANALYTES
from electrolog.units import Unit

_STAGES = {"pre": r"\b(pre|before|prior)(?=cal|\b)", "post": r"\b(post|after)(?=cal|\b)"}
_SIGN = r"[unmp]?[am]\s*(?:/|per)\s*[unmp]?[am]|[unp]a|[unmp]m|mv|v|min|hours|h|s|deg c|c"
_UNIT = re.compile(rf"[\[(]\s*([^\[\]()]*)\s*[\])]\s*$|(?:,|\bin\b|;|:|(?<=\S))\s+({_SIGN})\s*$")
_INVERSE = re.compile(r"[unmp]?m\s*(/|per)\s*[unpm]?a", re.IGNORECASE)
_AMOUNT = re.compile(r"(?<![\w.,])(\d+(?:[.,]\d+)?)\s*([unmp]m)\b", re.IGNORECASE)
_ANALYTES = {name.casefold() for analyte in ANALYTES for name in analyte[:2]}
_FOLD = str.maketrans({"\u00b5": "u", "\u03bc": "u", "\u2212": "-", "\u00b0": "", "\u00b7": " "})


@dataclass(frozen=True)
class Meaning:
    """What one column (or one labelled cell) holds. `unit` empty: not said; `per` inverted: µM per nA."""

    field: str
    unit: str = ""
    inverted: bool = False
    stage: str = ""
    concentration_um: float | None = None
    why: str = ""


@lru_cache(maxsize=50_000)  # texts repeat down a column, and every one of them may be a heading
def meaning(heading: str) -> Meaning | None:
    """None for a heading that says nothing known: its cells are kept in the row's note."""
    text = " ".join(heading.translate(_FOLD).casefold().split()).rstrip(":").strip()
    stage = next((stage for stage, pattern in _STAGES.items() if re.search(pattern, text)), "")
    amount = _AMOUNT.search(text)
    if amount:
        return _at_amount(text, amount, stage)
    bare, sign = _split_unit(text)
    if stage and not re.search(r"pre ?(/|or|-) ?post|before ?/ ?after", bare):
        bare = (
            re.sub(
                r"[-\s]*\b(pre|before|prior|post|after)(?=cal|\b)[-\s]*(cal\w*\.?|run|exp\w*\.?|implant\w*)?[-:\s]*",
                " ",
                bare,
            ).strip()
            or "sensitivity"
        )
    else:
        stage = ""
    if re.fullmatch(_SIGN, bare):
        bare, sign = (
            ("current" if bare.endswith("a") and "/" not in bare else "sensitivity" if "/" in bare else bare),
            bare,
        )
    found = "concentration" if bare in _ANALYTES and _molar(sign) else _field(bare)  # "DA (µM)" is how much of it
    if found is None:
        return None
    stage = stage if found in ("sensitivity", "sensitivity_se", "current", "day", "noise") else ""
    return _with_unit(Meaning(found, stage=stage, why=f"'{bare}'"), sign)


def _at_amount(text: str, amount: re.Match[str], stage: str) -> Meaning:
    """`1 uM (nA)`: the current at a concentration."""
    number = f"{amount[1].replace(',', '.')}{_molar(amount[2])}"
    concentration = units.parse_quantity(number, units.CONCENTRATION_UM)
    rest = (text[: amount.start()] + text[amount.end() :]).strip()
    sign = re.search(r"\b([pnum]a)\b", rest)
    found = Meaning("current", sign[1] if sign else "", False, stage, concentration, f"a current at {amount[0]}")
    return replace(found, unit=_spelled(found.unit, units.CURRENT_NA))


def _split_unit(text: str) -> tuple[str, str]:
    found = _UNIT.search(text)
    if not found:
        return text, ""
    rest, sign = text[: found.start()].strip(), (found[1] or found[2] or "").strip()
    if found[0].startswith("[") and not rest:  # "[DA]" is a concentration, not a unit
        return text, ""
    return (rest, sign) if rest else (text, "")


def _field(bare: str) -> str | None:
    name = bare.strip(" .-_#/:±")
    if (inner := re.fullmatch(r"\[([^\]]+)\]", bare)) and (named := _field(inner[1])) is not None:
        return named  # a heading that merely stands in brackets
    if re.match(r"\[[^\]]+\]", bare):
        trailing = re.sub(r"\[[^\]]+\]", "", bare).strip()
        return "concentration" if not trailing or _molar(trailing) else None
    for found, (_, pattern) in FIELDS.items():
        if re.fullmatch(pattern, name) or re.fullmatch(pattern, bare):
            return found
    return None


def _with_unit(found: Meaning, sign: str) -> Meaning:
    unit = FIELDS[found.field][0]
    if unit is None or not sign:
        return found
    if unit is units.SENSITIVITY_NA_UM and _INVERSE.fullmatch(sign.replace(" per ", "/")):
        return replace(found, unit=_upside_down(sign), inverted=True, why=f"{found.why}, upside down: {sign}")
    return replace(found, unit=_spelled(sign, unit), why=f"{found.why} in {sign}")


def _upside_down(sign: str) -> str:
    molar, _, ampere = sign.replace(" ", "").replace("per", "/").partition("/")
    return _spelled(f"{ampere}/{molar}", units.SENSITIVITY_NA_UM)


def _spelled(sign: str, unit: Unit) -> str:
    """As the column's own list has it; empty for a sign that doesn't belong here."""
    folded = "".join(sign.split()).replace("per", "/").casefold()
    folded = {"minutes": "min", "hours": "h", "hrs": "h", "deg c": "c"}.get(folded, folded)
    return next((known for known in unit.factors if known.casefold() == folded and known not in ("M", "fM")), "")


def _molar(sign: str) -> str:
    return {"um": "uM", "nm": "nM", "mm": "mM", "pm": "pM"}.get(sign.strip().casefold(), "")


def described(found: Meaning) -> str:
    """`current in nA at 0.5 µM, pre`."""
    if found.field == "derived":
        return "kept in the note: no raw value"
    parts = [found.field.replace("_", " ")]
    if found.unit:
        parts.append(f"in {found.unit}" if not found.inverted else f"upside down: 1 / ({found.unit})")
    if found.concentration_um is not None:
        parts.append(f"at {units.shown_concentration(found.concentration_um)}")
    return " ".join(parts) + (f", {found.stage}" if found.stage else "")


def checked(found: Meaning, heading: str) -> Meaning:
    """A meaning that somebody wrote into a mapping. Raises InputError for a field or unit that isn't there."""
    if found.field not in FIELDS:
        raise unknown("field", found.field, FIELDS)
    unit = FIELDS[found.field][0]
    if found.unit and (unit is None or found.unit not in unit.factors):
        accepted = ", ".join(unit.factors) if unit else "none"
        raise InputError(f"'{heading}': the unit '{found.unit}' doesn't belong to {found.field}; accepted: {accepted}")
    if found.stage not in ("", "pre", "interim", "post"):
        raise InputError(f"'{heading}': the stage '{found.stage}' is none; accepted: pre, interim, post")
    return found
