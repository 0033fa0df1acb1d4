"""How much carbon a probe had at a moment: it is measured when made, looked at, and trimmed."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from datetime import datetime

from electrolog.answers import life as lives
from electrolog.record import sheets
from electrolog.record.queries import Event
from electrolog.record.readable import Row


@dataclass(frozen=True)
class Carbon:
    """None: unknown."""

    geometry: str | None
    diameter_um: float | None
    exposed_length_um: float | None


def carbon_at(probe: Row, life: Sequence[Event], moment: datetime) -> Carbon:
    """The last length known by then; after a re-cut without one it is unknown until it is measured again."""
    length = probe["exposed_length_um"]
    for event in lives.until(life, moment):
        if event.sheet is sheets.RECUTS or (event.sheet is sheets.INSPECTIONS and event.row["exposed_length_um"]):
            length = event.row["exposed_length_um"]
    return Carbon(probe["geometry"], probe["diameter_um"] or probe["fibre_diameter_um"], length)
