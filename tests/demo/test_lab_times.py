"""The invented lab's events carry an offset and happen in an order that a real lab's could."""

from __future__ import annotations

from collections import Counter, defaultdict
from datetime import date, datetime, timedelta
from itertools import pairwise

import pytest

Rows = dict[str, list[dict[str, str]]]


def moment(text: str) -> datetime:
    found = datetime.fromisoformat(text)
    assert found.utcoffset() is not None, text
    return found


def spans_by_probe(rows: Rows) -> dict[str, list[tuple[datetime, datetime, str]]]:
    """Everything that happens to a probe, as start, end, file."""
    spans = defaultdict(list)
    for name, table in rows.items():
        for row in table:
            if "electrode" in row and ("at" in row or "start" in row):
                start = moment(row.get("start") or row["at"])
                minutes = 30 if name == "calibrations.csv" else float(row.get("duration_min") or 0)
                spans[row["electrode"]].append((start, start + timedelta(minutes=minutes), name))
    return {electrode: sorted(events) for electrode, events in spans.items()}


def test_nothing_happens_to_a_probe_twice_at_once(any_rows: Rows) -> None:
    for electrode, events in spans_by_probe(any_rows).items():
        for (_, end, what), (start, _, then) in pairwise(events):
            assert end <= start, f"{electrode}: {what} until {end}, {then} from {start}"


def test_nothing_happens_before_the_making_or_after_the_retirement(any_rows: Rows) -> None:
    made = {row["batch"]: date.fromisoformat(row["made_on"]) for row in any_rows["batches.csv"]}
    batch_of = {row["electrode"]: row["batch"] for row in any_rows["electrodes.csv"]}
    retired = {row["electrode"]: moment(row["at"]) for row in any_rows["retirements.csv"]}
    for electrode, events in spans_by_probe(any_rows).items():
        assert events[0][0].date() > made[batch_of[electrode]]
        if electrode in retired:
            assert max(end for _, end, _ in events) == retired[electrode]


def test_an_exposed_probe_was_calibrated_before(any_rows: Rows) -> None:
    first: dict[str, datetime] = {}
    for row in any_rows["calibrations.csv"]:
        first.setdefault(row["electrode"], moment(row["at"]))
    assert all(first[row["electrode"]] < moment(row["start"]) for row in any_rows["exposures.csv"])


def test_a_rig_calibrates_one_probe_at_a_time(any_rows: Rows) -> None:
    starts = Counter((row["rig"], moment(row["at"])) for row in any_rows["calibrations.csv"])
    assert max(starts.values()) == 1


def test_the_lab_works_in_its_own_zone_on_working_days_within_its_fourteen_months(any_rows: Rows) -> None:
    for events in spans_by_probe(any_rows).values():
        for start, _, name in events:
            assert date(2025, 9, 1) <= start.date() <= date(2026, 10, 31)
            assert start.weekday() < 5, (name, start)
            assert 8 <= start.hour < 20, (name, start)


def test_offsets_follow_summer_time(rows: Rows) -> None:
    zoneinfo = pytest.importorskip("zoneinfo")
    try:
        zone = zoneinfo.ZoneInfo("Europe/Berlin")  # any zone of central European time
    except zoneinfo.ZoneInfoNotFoundError:
        pytest.skip("this machine has no list of zones")
    offsets = set()
    for events in spans_by_probe(rows).values():
        for start, _, _ in events:
            assert start.utcoffset() == start.astimezone(zone).utcoffset(), start
            offsets.add(start.utcoffset())
    assert offsets == {timedelta(hours=1), timedelta(hours=2)}
