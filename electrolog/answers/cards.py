"""What the judge must know of a probe beside its forecast, as it stood after its last event: one card per probe."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import asdict, dataclass
from datetime import date, datetime, timedelta
from typing import Any

from electrolog.answers import life as lives
from electrolog.answers.asked import Asked
from electrolog.answers.checking import calibration_facts
from electrolog.answers.cohorts import coating
from electrolog.answers.standing import out_of_use, unanswerable
from electrolog.judge.facts import CalibrationFacts, Reason
from electrolog.record.readable import Row


@dataclass(frozen=True)
class Card:
    """`calibration` holds the age that it had at `asked_at`; `lasts`: whether all stays true until the next event."""

    electrode: str
    batch: str | None
    coating: str
    uses: int
    out_of_use: str
    calibration: CalibrationFacts | None
    aside: Reason | None
    asked_at: datetime
    last_event_at: datetime | None
    lasts: bool

    def at(self, moment: datetime) -> CalibrationFacts | None:
        """The last calibration as old as it is by then."""
        if self.calibration is None:
            return None
        values = dict(self.calibration.__dict__)  # quicker than replace(), which counts for ten thousand probes
        values["age_h"] += (moment - self.asked_at) / timedelta(hours=1)
        return CalibrationFacts(**values)


def card_of(asked: Asked, label: str, standards: Mapping[str, Row]) -> Card:
    life = asked.life[label]
    aside = unanswerable(asked, label)
    in_use = lives.in_use_until(life, asked.moment) is not None
    return Card(
        label,
        asked.probes[label]["batch"],
        coating(life),
        lives.state(life, asked.moment).uses,
        out_of_use(label, life, asked.moment),
        calibration_facts(asked, label, standards),
        aside,
        asked.moment,
        life[-1].at if life else None,
        lasts=aside is None and not in_use and not asked.ahead[label] and not _made_later(asked, label),
    )


def _made_later(asked: Asked, label: str) -> bool:
    made_on: date | None = asked.probes[label]["made_on"]
    return made_on is not None and made_on > asked.moment.date()


def to_dict(card: Card) -> dict[str, Any]:
    moments = {"asked_at": card.asked_at.isoformat(), "last_event_at": None}
    if card.last_event_at is not None:
        moments["last_event_at"] = card.last_event_at.isoformat()
    return asdict(card) | moments


def from_dict(kept: Mapping[str, Any]) -> Card:
    facts, last = kept["calibration"], kept["last_event_at"]
    values = {
        **kept,
        "calibration": None
        if facts is None
        else CalibrationFacts(**{**facts, "events_since": tuple(facts["events_since"])}),
        "asked_at": datetime.fromisoformat(kept["asked_at"]),
        "last_event_at": None if last is None else datetime.fromisoformat(last),
    }
    return Card(**values)
