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
    made_on: date | None
    in_use_until: datetime | None
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
    in_use_until = lives.in_use_until(life, asked.moment)
    return Card(
        label,
        asked.probes[label]["batch"],
        coating(life),
        lives.state(life, asked.moment).uses,
        out_of_use(label, life, asked.moment),
        calibration_facts(asked, label, standards),
        aside,
        asked.probes[label]["made_on"],
        in_use_until,
        asked.moment,
        life[-1].at if life else None,
        lasts=aside is None and in_use_until is None and not asked.ahead[label],
    )


def to_dict(card: Card) -> dict[str, Any]:
    """Of a card that lasts: nothing is under way, and nothing stands in the way of an answer."""
    told = asdict(card) | {name: _iso(getattr(card, name)) for name in ("made_on", "asked_at", "last_event_at")}
    return {name: value for name, value in told.items() if name not in ("in_use_until", "aside", "lasts")}


def from_dict(kept: Mapping[str, Any]) -> Card:
    facts, made_on, last = kept["calibration"], kept["made_on"], kept["last_event_at"]
    values = {
        **kept,
        "calibration": facts and CalibrationFacts(**{**facts, "events_since": tuple(facts["events_since"])}),
        "made_on": None if made_on is None else date.fromisoformat(made_on),
        "asked_at": datetime.fromisoformat(kept["asked_at"]),
        "last_event_at": None if last is None else datetime.fromisoformat(last),
    }
    return Card(**values, in_use_until=None, aside=None, lasts=True)


def _iso(when: date | None) -> str | None:
    return None if when is None else when.isoformat()
