"""The run on record in which a recording was made."""

from __future__ import annotations

from dataclasses import dataclass
from datetime import datetime, timedelta

from electrolog.answers import exposed
from electrolog.answers import life as lives
from electrolog.record import queries, sheets
from electrolog.record.queries import Event
from electrolog.record.store import Record


@dataclass(frozen=True)
class Recorded:
    """First sample's moment, length, and the moment of its clock's zero; None: unknown."""

    start: datetime | None
    length_s: float | None
    zero: datetime | None


def run_of(record: Record, label: str, exposure: int | None, recorded: Recorded, name: str) -> Event | None:
    """By its number, by its time, by the recording's name; None where the record has none then.

    Raises InputError, listing the exposures there are, where several may be meant.
    """
    with record.reading() as connection:
        (probe,) = queries.probes(connection, [label])
        life = queries.events(connection, [probe["id"]], (sheets.EXPOSURES,)).get(label, [])
    if exposure is not None:
        return exposed.find(life, exposed.Asked(exposure, None, name))
    if recorded.start is not None:
        life = _at_that_time(life, recorded)
        if len(life) == 1:
            return life[0]
    return exposed.find(life, exposed.Asked(None, None, name)) if life else None


def _at_that_time(life: list[Event], recorded: Recorded) -> list[Event]:
    assert recorded.start is not None  # noqa: S101 -- asked only then
    end = recorded.start + timedelta(seconds=recorded.length_s or 0.0)
    return [event for event in life if event.at < end and lives.end_of(event) > recorded.start]
