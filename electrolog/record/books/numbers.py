"""What a cell that should hold a number holds: a number, a limit that it stayed under, or nothing known."""

from __future__ import annotations

import re
from collections.abc import Iterable
from dataclasses import dataclass
from datetime import date, datetime, time

from electrolog.errors import InputError, shortened
from electrolog.record.books.grid import Content, shown
from electrolog.units import Unit, parse_quantity

UNKNOWN = {"", "-", "–", "—", "?", "n/a", "na", "n.a.", "nan", "none", "nd", "n.d.", "not done", "missing", "x", "#n/a"}
_BELOW = re.compile(
    r"[<>≤≥]\s*(lod|loq|dl|\d.*)|(below|under) (lod|loq|detection.*)|bdl|blq|b\.?d\.?l\.?", re.IGNORECASE
)
_ABOUT = re.compile(r"^(~|≈|ca\.?|c\.|about|approx\.?)\s*", re.IGNORECASE)
_WITH_ERROR = re.compile(r"(.+?)\s*(?:±|\+/-|\+-)\s*(.+)")
_BARE = re.compile(r"[+-]?(\d+\.?\d*|\.\d+)(e[+-]?\d+)?", re.IGNORECASE)
_GROUPED_COMMA = re.compile(r"[+-]?\d{1,3}(,\d{3})+(\.\d+)?(?!\d)")
_GROUPED_POINT = re.compile(r"[+-]?\d{1,3}(\.\d{3})+(,\d+)?(?!\d)")
_CERTAIN_COMMA = re.compile(r"\d,(\d{1,2}|\d{4,})(?!\d)|(?<!\d)0,\d|\d\.\d{3},\d")
_EITHER_WAY = re.compile(r"(?<![\d.,])[1-9]\d{0,2},\d{3}(?![\d.,])")


@dataclass(frozen=True)
class Said:
    """`value` None: unknown. `doubt` says what a person should look at; `error` is what stood after a ±."""

    value: float | None
    error: float | None = None
    doubt: str = ""


def number(cell: Content, unit: Unit, what: str, comma: bool, sign: str = "") -> Said:
    """A cell's number in `unit`, a bare one read in `sign`. `comma`: the book's decimal mark.

    Raises InputError for what is neither a number nor a way to say that there is none.
    """
    if isinstance(cell, bool | datetime | date | time):
        raise InputError(f"{what}: found {shown(cell)}; accepted: a number, an empty cell or n/a")
    if cell is None:
        return Said(None)
    text = shown(cell)
    if text.casefold() in UNKNOWN:
        return Said(None, doubt=f"'{text}' taken as unknown")
    if _BELOW.fullmatch(text):
        return Said(None, doubt=f"'{shortened(text, 30)}' is a bound, not a reading: taken as unknown")
    about = _ABOUT.match(text)
    text = text[about.end() :] if about else text
    split = _WITH_ERROR.fullmatch(text)
    value, error = (split[1], split[2]) if split else (text, None)
    comma = comma and isinstance(cell, str)
    return Said(
        _quantity(value, unit, what, comma, sign),
        None if error is None else _quantity(error, unit, what, comma, sign),
        f"'{shortened(shown(cell), 30)}' is approximate" if about else "",
    )


def _quantity(text: str, unit: Unit, what: str, comma: bool, sign: str) -> float:
    typed = plain(text, comma)
    return parse_quantity(f"{typed}{sign}" if _BARE.fullmatch(typed) else typed, unit, what)


def plain(text: str, comma: bool) -> str:
    """With a point for the decimal mark, and no sign between thousands."""
    text = text.strip()
    if comma:
        return text.replace(".", "").replace(",", ".", 1) if _GROUPED_POINT.match(text) else text.replace(",", ".", 1)
    grouped = _GROUPED_COMMA.match(text)
    return grouped[0].replace(",", "") + text[grouped.end() :] if grouped else text


def decimal_mark(cells: Iterable[Content]) -> tuple[str, str]:
    """The mark that the numbers typed as text must have, and why; an empty mark: they can be read either way."""
    texts = [cell for cell in cells if isinstance(cell, str) and len(cell) < 40]
    certain = next((text for text in texts if _CERTAIN_COMMA.search(text) and _is_numeric(text)), None)
    if certain is not None:
        return ",", f"'{certain}' can't have another"
    either = next((text for text in texts if _EITHER_WAY.search(text) and _is_numeric(text)), None)
    if either is not None:
        return "", f"'{either}' may be {either.replace(',', '.')} or {either.replace(',', '')}"
    return ".", "no number is written with a comma"


def _is_numeric(text: str) -> bool:
    return re.fullmatch(r"[~<>≈±+\-\s\d.,eEµμnpumMAV/%]*", text) is not None
