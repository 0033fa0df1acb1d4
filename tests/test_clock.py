"""Moments as people type them, in UTC or refused: never a silent guess at which of two moments was meant."""

from __future__ import annotations

import time
from datetime import UTC, date, datetime, timedelta, timezone
from zoneinfo import ZoneInfo

import pytest
from hypothesis import given
from hypothesis import strategies as st

from electrolog.clock import iso_utc, parse_day, parse_iso, parse_moment, shown_moment, utc_now, zone_named
from electrolog.errors import InputError

LISBON = ZoneInfo("Europe/Lisbon")  # clocks go forward on 2026-03-29 at 01:00 UTC and back on 2026-10-25
NEW_YORK = ZoneInfo("America/New_York")
NOW = datetime(2026, 6, 15, 12, 0, tzinfo=UTC)


@pytest.fixture(autouse=True)
def _noon(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setenv("ELECTROLOG_NOW", "2026-06-15T12:00:00Z")


@pytest.mark.parametrize(
    ("text", "utc"),
    [
        ("now", "2026-06-15T12:00"),
        (" NOW ", "2026-06-15T12:00"),
        ("2h ago", "2026-06-15T10:00"),
        ("2h10min ago", "2026-06-15T09:50"),
        ("90 ago", "2026-06-15T10:30"),
        ("yesterday 14:30", "2026-06-14T13:30"),
        ("Yesterday  at 14.30", "2026-06-14T13:30"),
        ("today 9:05", "2026-06-15T08:05"),
        ("14:30", "2026-06-15T13:30"),
        ("14:30:15", "2026-06-15T13:30:15"),
        ("tomorrow 10:00", "2026-06-16T09:00"),
        ("2026-03-14T14:30", "2026-03-14T14:30"),
        ("2026-03-14 14:30", "2026-03-14T14:30"),
        ("2026-03-14T14:30+01:00", "2026-03-14T13:30"),
        ("2026-07-14T14:30Z", "2026-07-14T14:30"),
        ("20260314T143000", "2026-03-14T14:30"),
    ],
)
def test_a_moment_is_read_in_the_labs_zone(text: str, utc: str) -> None:
    assert parse_moment(text, LISBON) == datetime.fromisoformat(utc).replace(tzinfo=UTC)


@pytest.mark.parametrize("text", ["yesterday", "today", "2026-03-14", "20260314", "2026-W11-6", "2026-W11"])
def test_a_day_without_a_time_is_refused(text: str) -> None:
    with pytest.raises(InputError, match="a day without a time"):
        parse_moment(text, LISBON)


@pytest.mark.parametrize(
    "text",
    [
        "",
        "ago",
        "soon",
        "last friday",
        "24:00",
        "14:60",
        "1430",
        "2026-02-30T10:00",
        "2026-13-01T10:00",
        "14.3.2026 10:00",
        "2026-03-14T14:30+25:00",
        "-2h ago",
        "x ago",
    ],
)
def test_what_is_no_moment_is_refused(text: str) -> None:
    with pytest.raises(InputError, match="accepted:"):
        parse_moment(text, LISBON)


@pytest.mark.parametrize(
    "text", ["1969-12-31T23:59Z", "2200-01-01T00:00Z", "0001-01-01T00:00+14:00", "9999-12-31T23:59-14:00"]
)
def test_a_year_out_of_range_is_refused(text: str) -> None:
    with pytest.raises(InputError, match="out of range"):
        parse_moment(text)


@pytest.mark.parametrize("text", ["1970-01-01T00:00+14:00", "2199-12-31T23:59-12:00"])
def test_a_moment_whose_utc_lies_out_of_range_is_refused(text: str) -> None:
    """Its own export, in UTC, could not be read again."""
    with pytest.raises(InputError, match="out of range"):
        parse_moment(text)


@pytest.mark.parametrize("text", ["99999999d ago", "900000000000000h ago", "30000d ago"])
def test_an_age_beyond_the_calendar_is_refused(text: str) -> None:
    with pytest.raises(InputError, match="out of range"):
        parse_moment(text)


@pytest.mark.parametrize(
    ("zone", "gap", "overlap"),
    [(LISBON, "2026-03-29T01:30", "2026-10-25T01:30"), (NEW_YORK, "2026-03-08T02:30", "2026-11-01T01:30")],
)
def test_the_hour_in_which_clocks_change_is_refused(zone: ZoneInfo, gap: str, overlap: str) -> None:
    for text in (gap, overlap):
        with pytest.raises(InputError, match="clocks change"):
            parse_moment(text, zone)
        assert parse_moment(f"{text}+00:00", zone) == datetime.fromisoformat(text).replace(tzinfo=UTC)


def test_the_hour_is_refused_by_words_too(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setenv("ELECTROLOG_NOW", "2026-10-26T12:00:00Z")
    with pytest.raises(InputError, match="clocks change"):
        parse_moment("yesterday 01:30", LISBON)
    assert parse_moment("yesterday 02:30", LISBON) == datetime(2026, 10, 25, 2, 30, tzinfo=UTC)


@pytest.mark.skipif(not hasattr(time, "tzset"), reason="this platform's zone can't be set for one process")
def test_without_a_zone_the_machines_own_holds(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setenv("TZ", "America/New_York")
    time.tzset()
    try:
        assert parse_moment("2026-07-01T08:00") == datetime(2026, 7, 1, 12, 0, tzinfo=UTC)
        with pytest.raises(InputError, match="clocks change"):
            parse_moment("2026-11-01T01:30")
    finally:
        monkeypatch.undo()
        time.tzset()


@given(
    st.datetimes(datetime(1971, 1, 1), datetime(2199, 1, 1)),
    st.integers(-14 * 60, 14 * 60),
)
def test_iso_with_an_offset_comes_back_as_the_same_moment(naive: datetime, offset_min: int) -> None:
    moment = naive.replace(tzinfo=timezone(timedelta(minutes=offset_min)))
    read = parse_iso(moment.isoformat(), LISBON)
    assert read == moment
    assert read.tzinfo is UTC
    assert parse_iso(iso_utc(read), NEW_YORK) == moment


@given(st.text(max_size=40))
def test_any_text_is_a_moment_in_utc_or_refused(text: str) -> None:
    try:
        moment = parse_moment(text, LISBON)
    except InputError:
        return
    assert moment.tzinfo is UTC


@pytest.mark.parametrize("name", ["Mars/Base", "", "Europe", "../etc/passwd", "/etc/passwd", "x" * 5000, "a\0b"])
def test_an_unknown_zone_is_refused(name: str) -> None:
    if not name:
        assert zone_named(name) is None
        return
    with pytest.raises(InputError, match="no time zone"):
        zone_named(name)


def test_utc_and_named_zones_are_known() -> None:
    assert zone_named("utc") is UTC
    assert zone_named("Europe/Lisbon") == LISBON


@pytest.mark.parametrize(
    ("text", "day"), [("2026-03-14", "2026-03-14"), (" 20260314 ", "2026-03-14"), ("2026-W11-6", "2026-03-14")]
)
def test_a_day_is_read(text: str, day: str) -> None:
    assert parse_day(text) == date.fromisoformat(day)


def test_today_is_the_labs_own(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setenv("ELECTROLOG_NOW", "2026-06-15T02:00:00Z")
    assert parse_day("today", LISBON) == date(2026, 6, 15)
    assert parse_day("today", NEW_YORK) == date(2026, 6, 14)
    assert parse_day("yesterday", NEW_YORK) == date(2026, 6, 13)


@pytest.mark.parametrize("text", ["", "14.3.2026", "2026-02-30", "1969-12-31", "2200-01-01", "soon"])
def test_what_is_no_day_is_refused(text: str) -> None:
    with pytest.raises(InputError, match="accepted:"):
        parse_day(text)


def test_the_clock_can_be_held_still_for_a_walk_through(monkeypatch: pytest.MonkeyPatch) -> None:
    assert utc_now() == NOW
    monkeypatch.delenv("ELECTROLOG_NOW")
    assert abs(utc_now() - datetime.now(UTC)) < timedelta(seconds=5)


def test_people_are_shown_their_own_time() -> None:
    assert shown_moment(NOW, LISBON) == "2026-06-15 13:00"
    assert iso_utc(NOW) == "2026-06-15T12:00:00Z"
    assert iso_utc(NOW.replace(microsecond=5)) == "2026-06-15T12:00:00.000005Z"
