"""Days as people write them in a cell, and the order of day, month and year that a column must have."""

from __future__ import annotations

import re
from collections.abc import Iterable
from dataclasses import dataclass
from datetime import date, datetime, time

from electrolog.clock import utc_now
from electrolog.errors import InputError, shortened
from electrolog.record.books.grid import Content, shown

EARLIEST = 1970
ORDERS = ("dmy", "mdy", "ymd")
MONTHS = {
    name: number
    for number, names in enumerate(
        (
            ("jan", "january"),
            ("feb", "february"),
            ("mar", "march", "mär", "märz"),
            ("apr", "april"),
            ("may", "mai"),
            ("jun", "june", "juni"),
            ("jul", "july", "juli"),
            ("aug", "august"),
            ("sep", "sept", "september"),
            ("oct", "october", "okt", "oktober"),
            ("nov", "november"),
            ("dec", "december", "dez", "dezember"),
        ),
        start=1,
    )
    for name in names
}
_THREE = re.compile(r"(\d{1,4})\s*([./-])\s*(\d{1,2})\s*\2\s*(\d{1,4})")
_NAMED = re.compile(
    r"(\d{1,2})[.\s/-]+([^\W\d]+)\.?[,\s/-]+'?(\d{4}|\d{2})|([^\W\d]+)\.?\s+(\d{1,2}),?\s+'?(\d{4}|\d{2})"
)
_CLOCK = re.compile(r"(\d{1,2})[:h](\d{2})(?::(\d{2}))?\s*([ap]m)?", re.IGNORECASE)
_ACCEPTED = "accepted: a date such as 2024-03-14, 14.03.2024 or 14 Mar 24"


@dataclass(frozen=True)
class When:
    """A day, and the time of day where the cell has one."""

    day: date
    time: time | None = None
    doubt: str = ""


def when(cell: Content, order: str) -> When:
    """Raises InputError for what is no date, or one that `order` doesn't allow."""
    if isinstance(cell, datetime):
        return When(cell.date(), None if cell.time() == time() else cell.time())
    if isinstance(cell, date):
        return When(cell)
    text = shown(cell)
    if re.fullmatch(r"(19|20)\d{6}", text):
        return When(_made(int(text[:4]), int(text[4:6]), int(text[6:]), text))
    if isinstance(cell, float):
        raise InputError(f"date: the number {text} is no date; {_ACCEPTED}", "format the cell as a date and save")
    day, rest = _day(text, order)
    clock = rest.strip(" ,T")
    two_digits = day.isoformat()[:4] not in text and not re.search(r"\d{4}", text)
    return When(
        day, clock_time(clock) if clock else None, f"year of '{text}' taken as {day.year}" if two_digits else ""
    )


def clock_time(cell: Content) -> time:
    """A time of day. Raises InputError."""
    if isinstance(cell, datetime):
        return cell.time()
    if isinstance(cell, time):
        return cell
    if isinstance(cell, float) and 0 <= cell < 1:  # a spreadsheet's own: a share of a day
        seconds = round(cell * 86_400)
        return time(seconds // 3600 % 24, seconds // 60 % 60, seconds % 60)
    found = _CLOCK.match(shown(cell).removesuffix("Z"))
    if found is None:
        raise InputError(f"time: '{shortened(shown(cell))}' is no time of day; accepted: such as 14:30")
    hour = int(found[1]) % 12 + 12 * (found[4].lower() == "pm") if found[4] else int(found[1])
    try:
        return time(hour, int(found[2]), int(found[3] or 0))
    except ValueError:
        raise InputError(f"time: '{shortened(shown(cell))}' is no time of day; accepted: such as 14:30") from None


def order_in_heading(heading: str) -> str:
    """`Date (dd/mm/yy)` says it; empty for a heading that doesn't."""
    found = re.search(r"\b([dmy])\1{0,3}([./-])([dmy])\3{0,3}\2([dmy])\4{0,3}\b", heading.casefold())
    order = found[1] + found[3] + found[4] if found else ""
    return order if order in ORDERS else ""


def date_order(cells: Iterable[Content]) -> tuple[str, str]:
    """The order that every date typed as text allows, and why; empty where two orders would do."""
    possible, witness = set(ORDERS), ""
    for text in (cell for cell in cells if isinstance(cell, str)):
        found = _THREE.match(text)
        if found and len(found[1]) < 4:
            allowed = possible & _orders_of(found)
            if allowed and (allowed != possible or not witness):
                possible, witness = allowed, text
    if not witness:
        return "ymd", "every date says itself which part is the year"
    if len(possible) == 1:
        return possible.pop(), f"'{witness}' allows no other"
    return "", f"'{witness}' may be {' or '.join(sorted(possible))}"


def _orders_of(found: re.Match[str]) -> set[str]:
    """Parts between points stand in the order day, month, year wherever that is a day (common practice)."""
    first, sign, second, third = found.groups()
    orders = {order for order in ORDERS if _is_day(first, second, third, order)}
    return {"dmy"} if sign == "." and "dmy" in orders else orders


def _is_day(first: str, second: str, third: str, order: str) -> bool:
    if len(dict(zip(order, (first, second, third), strict=True))["y"]) == 1 or (len(third) == 4 and order == "ymd"):
        return False
    try:
        return date(*_parts(first, second, third, order)).year >= EARLIEST
    except ValueError:
        return False


def _parts(first: str, second: str, third: str, order: str) -> tuple[int, int, int]:
    by_sign = dict(zip(order, (first, second, third), strict=True))
    return _whole_year(by_sign["y"]), int(by_sign["m"]), int(by_sign["d"])


def _whole_year(digits: str) -> int:
    """Two digits stand for the newest year of that ending which isn't in the future."""
    if len(digits) > 2:
        return int(digits)
    this = utc_now().year
    year = this - this % 100 + int(digits)
    return year if year <= this else year - 100


def _day(text: str, order: str) -> tuple[date, str]:
    """The day at the beginning of the text, and the text behind it."""
    named = _NAMED.match(text)
    if named:
        day, month, year = (named[1], named[2], named[3]) if named[1] else (named[5], named[4], named[6])
        number = MONTHS.get(month.casefold())
        if number:
            return _made(_whole_year(year), number, int(day), text), text[named.end() :]
    found = _THREE.match(text)
    if not found:
        raise InputError(f"date: '{shortened(text)}' is no date; {_ACCEPTED}")
    first, _, second, third = found.groups()
    order = "ymd" if len(first) == 4 else order
    if not order:
        raise InputError(f"date: '{shortened(text)}' can be read in two ways; accepted: see the question of date_order")
    return _made(*_parts(first, second, third, order), text), text[found.end() :]


def _made(year: int, month: int, day: int, text: str) -> date:
    try:
        made = date(year, month, day)
    except ValueError:
        made = date.min
    if made.year < EARLIEST:
        raise InputError(f"date: '{shortened(text)}' is no day since {EARLIEST} in the order of this book; {_ACCEPTED}")
    return made
