"""When the lab works: its days, its zone, and who may use the rigs when."""

from __future__ import annotations

from collections import Counter
from datetime import date, datetime, time, timedelta, timezone

from .truth import TRUTH

OPENS_H, CLOSES_H = 8.5, 19.0
HALF_HOUR = timedelta(minutes=30)


def at(day: date, hour: float) -> datetime:
    """The moment in the lab's own zone. The zone is written out: Windows has no list of zones of its own."""
    summer = any(start <= day < end for start, end in TRUTH["summer_time"])
    zone = timezone(timedelta(hours=TRUTH["utc_offset_h"] + summer))
    return datetime.combine(day, time(), zone) + timedelta(minutes=round(hour * 60))


def workday(day: date) -> date:
    """The day itself, or the next one on which the lab works."""
    while day.weekday() >= 5 or any(first <= day <= last for first, last in TRUTH["closed"]):
        day += timedelta(days=1)
    return day


def next_workday(day: date) -> date:
    return workday(day + timedelta(days=1))


class Bookings:
    """One probe at a time on a rig, and no more runs a day than people can attend to."""

    def __init__(self) -> None:
        self._runs: Counter[date] = Counter()
        self._taken: set[tuple[datetime, str]] = set()

    def run_day(self, earliest: date) -> date:
        day = workday(earliest)
        while self._runs[day] >= TRUTH["life"]["runs_a_day"]:
            day = next_workday(day)
        self._runs[day] += 1
        return day

    def calibration_slot(self, earliest: datetime) -> tuple[datetime, str]:
        start = _next_half_hour(earliest)
        while True:
            if start > at(start.date(), CLOSES_H):
                start = at(next_workday(start.date()), OPENS_H)
            for rig in TRUTH["rig_gain"]:
                if (start, rig) not in self._taken:
                    self._taken.add((start, rig))
                    return start, rig
            start += HALF_HOUR


def _next_half_hour(moment: datetime) -> datetime:
    return moment + timedelta(minutes=-moment.minute % 30)
