"""What a colleague looking over the shoulder would ask before an entry is written. Asked, never corrected."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from datetime import datetime, timedelta
from typing import Any

from electrolog.answers import life as lives
from electrolog.clock import shown_moment, utc_now
from electrolog.record import sheets
from electrolog.record.queries import Event
from electrolog.record.sheets import Sheet
from electrolog.units import shown_duration

LONGEST_USUAL_H = 24.0
Values = Mapping[str, Any]


def of_event(
    sheet: Sheet, values: Values, life: Sequence[Event], made_on: Any, now: datetime | None = None
) -> list[str]:
    """Doubts about one new event of a probe whose life so far is `life`."""
    moment: datetime = values[sheet.time_column or "at"]
    probe = values["electrode"]
    said = []
    if moment > (now or utc_now()) + timedelta(minutes=5):
        said.append(f"{probe}: {shown_moment(moment)} lies in the future")
    if made_on is not None and moment.date() < made_on - timedelta(days=1):
        said.append(f"{probe}: {shown_moment(moment)} lies before the probe was made ({made_on})")
    retired = lives.of(life, sheets.RETIREMENTS)
    if retired and sheet is not sheets.RETIREMENTS and moment > retired[0].at:
        said.append(f"{probe} was retired on {shown_moment(retired[0].at)} ({retired[0].row['reason']})")
    if sheet is sheets.EXPOSURES:
        said += _exposure(values, life)
    elif sheet is not sheets.CALIBRATIONS:
        said += _while_exposed(sheet, values, life, moment)
    return said


def _exposure(values: Values, life: Sequence[Event]) -> list[str]:
    said = []
    start, minutes = values["start"], values["duration_min"]
    if minutes > LONGEST_USUAL_H * 60:
        said.append(f"{values['electrode']}: {shown_duration(minutes)} is a long run (minutes typed as hours?)")
    end = start + timedelta(minutes=minutes)
    for other in lives.of(life, sheets.EXPOSURES):
        if other.at < end and lives.end_of(other) > start:
            said.append(
                f"{values['electrode']}: overlaps with {other.name}, {other.row['setting']} from"
                f" {shown_moment(other.at)} for {shown_duration(other.row['duration_min'])}:"
                " a probe can't be in two places at once"
            )
    return said


def _while_exposed(sheet: Sheet, values: Values, life: Sequence[Event], moment: datetime) -> list[str]:
    return [
        f"{values['electrode']}: the {sheet.one} falls into {other.name} ({other.row['setting']} from"
        f" {shown_moment(other.at)} for {shown_duration(other.row['duration_min'])})"
        for other in lives.of(life, sheets.EXPOSURES)
        if other.at < moment < lives.end_of(other) and sheet is not sheets.INSPECTIONS
    ]
