"""Moments: what people type, what the record keeps (UTC only), what a person is shown (their own zone)."""

from __future__ import annotations

import os
import re
from collections.abc import Sequence
from datetime import UTC, date, datetime, timedelta, tzinfo
from zoneinfo import ZoneInfo

from electrolog.errors import InputError, shortened
from electrolog.units import MINUTES, parse_quantity

_DAY_WORDS = {"today": 0, "yesterday": -1, "tomorrow": 1}
_TIME_OF_DAY = re.compile(r"(\d{1,2})[:.h](\d{2})(?::(\d{2}))?")
_EARLIEST, _LATEST = 1970, 2200
_ISO = "ISO 8601 such as 2026-03-14T14:30+01:00"
_ACCEPTED = f"now, '2h ago', 'yesterday 14:30', '14:30' (today) or {_ISO}"


def utc_now() -> datetime:
    """The present moment; ELECTROLOG_NOW fixes it, so that a walk-through gives the same answers on any day."""
    fixed = os.environ.get("ELECTROLOG_NOW")
    return parse_iso(fixed, UTC, "ELECTROLOG_NOW") if fixed else datetime.now(UTC)


def zone_named(name: str | None) -> tzinfo | None:
    """The named zone; None stands for the machine's own, whose offset depends on the date."""
    if not name:
        return None
    if name.upper() in ("UTC", "Z"):
        return UTC
    try:
        return ZoneInfo(name)
    except (KeyError, ValueError, OSError):  # OSError: a name that is a folder of the zone database
        raise InputError(
            f"zone: no time zone is called '{shortened(name)}'; accepted: UTC or a name such as Europe/Lisbon"
        ) from None


def parse_moment(text: str, zone: tzinfo | None = None, what: str = "at") -> datetime:
    """A typed moment in UTC. Raises InputError for what can't be read, or exists twice or never in the zone."""
    folded = " ".join(text.split()).casefold()
    now = utc_now()
    if folded == "now":
        return now
    if folded.endswith(" ago"):
        return _ago(now, folded.removesuffix(" ago"), text, what)
    word, _, rest = folded.partition(" ")
    days = _DAY_WORDS.get(word, 0)
    clock = _TIME_OF_DAY.fullmatch(rest.removeprefix("at ") if word in _DAY_WORDS else folded)
    if clock:
        day = (now.astimezone(zone) + timedelta(days=days)).date()
        return _at_time_of_day(day, clock, zone, text, what)
    if word in _DAY_WORDS:
        raise InputError(f"{what}: '{shortened(text)}' names a day without a time of day; accepted: {_ACCEPTED}")
    return parse_iso(text, zone, what, _ACCEPTED)


def parse_iso(text: str, zone: tzinfo | None = None, what: str = "at", accepted: str = _ISO) -> datetime:
    """An ISO 8601 moment in UTC; without an offset it is read in `zone` (None: the machine's)."""
    try:
        moment = datetime.fromisoformat(text.strip())
    except ValueError:
        raise InputError(f"{what}: '{shortened(text)}' is not a time; accepted: {accepted}") from None
    if re.fullmatch(r"\d{4}-?\d{2}-?\d{2}|\d{4}-?W\d{2}(-?\d)?", text.strip()):
        raise InputError(f"{what}: '{shortened(text)}' is a day without a time; accepted: {accepted}")
    return _to_utc(moment, zone, text, what)


def plain_moments(texts: Sequence[str]) -> list[datetime] | None:
    """What parse_iso says of each; None where one has no offset, lies far off or can't be read: ask it then."""
    try:
        moments = [datetime.fromisoformat(text) for text in texts]
        if not moments or None in [moment.tzinfo for moment in moments]:
            return None
        utc = [moment.astimezone(UTC) for moment in moments]
    except (ValueError, OverflowError):
        return None
    return utc if min(utc).year > _EARLIEST and max(utc).year + 1 < _LATEST else None


def parse_day(text: str, zone: tzinfo | None = None, what: str = "date") -> date:
    """A calendar date; `today` is the one of the zone (None: the machine's). Raises InputError."""
    stripped = text.strip()
    if stripped.casefold() in _DAY_WORDS:
        return utc_now().astimezone(zone).date() + timedelta(days=_DAY_WORDS[stripped.casefold()])
    try:
        day = date.fromisoformat(stripped)
    except ValueError:
        raise InputError(
            f"{what}: '{shortened(text)}' is not a date; accepted: ISO such as 2026-03-14, today, yesterday"
        ) from None
    if not _EARLIEST <= day.year < _LATEST:
        raise InputError(f"{what}: the year {day.year} is out of range; accepted: {_EARLIEST} to {_LATEST - 1}")
    return day


def _ago(now: datetime, span: str, text: str, what: str) -> datetime:
    minutes = parse_quantity(span, MINUTES, what)
    if minutes < 0:
        raise InputError(f"{what}: '{shortened(text)}' would lie in the future; accepted: {_ACCEPTED}")
    try:
        moment = now - timedelta(minutes=minutes)
    except OverflowError:
        moment = datetime.min.replace(tzinfo=UTC)
    return _within_range(moment, text, what)


def _at_time_of_day(day: date, clock: re.Match[str], zone: tzinfo | None, text: str, what: str) -> datetime:
    try:
        moment = datetime(day.year, day.month, day.day, int(clock[1]), int(clock[2]), int(clock[3] or 0))
    except ValueError:
        raise InputError(f"{what}: '{shortened(text)}' has no such time of day; accepted: {_ACCEPTED}") from None
    return _to_utc(moment, zone, text, what)


def _to_utc(moment: datetime, zone: tzinfo | None, text: str, what: str) -> datetime:
    _within_range(moment, text, what)  # before the conversion too, which would overflow in the year 1
    if moment.tzinfo is None:
        _refuse_doubled_or_missing(moment, zone, text, what)
        moment = moment.astimezone() if zone is None else moment.replace(tzinfo=zone)
    return _within_range(moment.astimezone(UTC), text, what)


def _within_range(moment: datetime, text: str, what: str) -> datetime:
    if not _EARLIEST <= moment.year < _LATEST:
        raise InputError(
            f"{what}: the year {moment.year} of '{shortened(text)}' is out of range;"
            f" accepted: {_EARLIEST} to {_LATEST - 1}"
        )
    return moment


def _refuse_doubled_or_missing(moment: datetime, zone: tzinfo | None, text: str, what: str) -> None:
    """When clocks change, an hour exists twice or not at all; taking one of them would be a silent guess."""
    first, second = (
        (m.astimezone() if zone is None else m.replace(tzinfo=zone)).utcoffset()
        for m in (moment.replace(fold=0), moment.replace(fold=1))
    )
    if first != second:
        raise InputError(
            f"{what}: '{shortened(text)}' falls in the hour in which the clocks change;"
            " accepted: the same with an offset, such as +01:00"
        )


def iso_utc(moment: datetime) -> str:
    """`2026-03-14T13:30:00Z`; fractions of a second only where there are any."""
    utc = moment.astimezone(UTC).replace(tzinfo=None)
    return utc.isoformat(timespec="seconds" if utc.microsecond == 0 else "microseconds") + "Z"


def shown_moment(moment: datetime, zone: tzinfo | None = None) -> str:
    local = moment.astimezone(zone)
    return local.strftime("%Y-%m-%d %H:%M")
