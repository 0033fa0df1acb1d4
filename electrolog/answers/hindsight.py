"""A lab's past cut off at a moment: what was known then of the cohort, and of a probe before its next calibration."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace
from datetime import datetime

import numpy as np
from numpy.typing import NDArray

from electrolog.answers import life as lives
from electrolog.answers.cohorts import Cohort, gather
from electrolog.fouling.events import EXPOSURE, READING, RENEWAL, Events
from electrolog.judge.backtest import Past, Targets
from electrolog.measure.calibrate import CalibrationFigures
from electrolog.record import sheets
from electrolog.record.queries import Event
from electrolog.record.readable import Row

Integers = NDArray[np.int64]
Floats = NDArray[np.float64]


@dataclass(frozen=True)
class History:
    """Everything the record holds of one analyte's cohort."""

    analyte: str
    probes: Sequence[Row]
    life: dict[str, list[Event]]
    figures: Mapping[int, CalibrationFigures]

    def known(self) -> Cohort:
        return gather(self.probes, self.life, self.figures, self.analyte)

    def known_before(self, moment: datetime) -> Cohort:
        """The cohort as it could be gathered then: later events and later coatings aren't there yet."""
        past = {label: [event for event in life if event.at < moment] for label, life in self.life.items()}
        return gather(self.probes, past, self.figures, self.analyte)


@dataclass(frozen=True)
class Target:
    """A calibration to be forecast; `earlier` are the same probe's before it, with the same waveform."""

    electrode: str
    waveform: str
    event: Event
    earlier: tuple[Event, ...]


@dataclass(frozen=True)
class Foresight:
    """What was known before each of N targets. `events` end at the target; ran: exposed, and not renewed, since the
    last own reading; reference: which own reading the share left is a share of, -1 where there is none.
    """

    events: Events
    targets: Targets
    reading: Floats
    ran: NDArray[np.bool_]
    reference: Integers


def targets_of(cohort: Cohort) -> list[Target]:
    """Every reading that has an earlier one of the same unit, oldest first."""
    found = [
        Target(electrode, waveform, event, tuple(readings[:place]))
        for (electrode, waveform), readings in cohort.readings.items()
        for place, event in enumerate(readings)
        if place
    ]
    return sorted(found, key=lambda target: (target.event.at, target.electrode, target.waveform))


def before(targets: Sequence[Target], history: History) -> Foresight:
    """Each target becomes a unit of its own, cut off at the target, under the label of the unit it stands for."""
    rows = {row["electrode"]: row for row in history.probes}
    alone = [{**rows[target.electrode], "electrode": str(k)} for k, target in enumerate(targets)]
    life = {str(k): _up_to(target, history.life[target.electrode]) for k, target in enumerate(targets)}
    units = [(str(k), target.waveform) for k, target in enumerate(targets)]
    events = gather(alone, life, history.figures, history.analyte, units).events
    labels = tuple(f"{target.electrode}\n{target.waveform}" for target in targets)
    kinds = {waveform: k for k, waveform in enumerate(sorted({target.waveform for target in targets}))}
    kind = np.array([kinds[target.waveform] for target in targets], dtype=np.int64)
    hours = exposed_hours(events)
    last = _last_reading(events)
    return Foresight(
        events=replace(_cut(events, last), units=labels),
        targets=Targets(kind, hours[last], *_own_past(events, hours, last)),
        reading=events.amount[last],
        ran=_ran(events, last),
        reference=np.array([_reference(target, life[str(k)]) for k, target in enumerate(targets)], dtype=np.int64),
    )


def past_of(cohort: Cohort, kinds: Mapping[str, int]) -> Past:
    """The cohort's readings as the simple rivals see them; kinds number the waveforms."""
    read = cohort.events.kind == READING
    unit = cohort.events.unit[read]
    kind = np.array([kinds.get(waveform, -1) for _, waveform in cohort.units], dtype=np.int64)
    return Past(unit, kind[unit], exposed_hours(cohort.events)[read], cohort.events.amount[read])


def exposed_hours(events: Events) -> Floats:
    """(N,) hours of exposure of the row's unit up to and with that row, in whatever setting."""
    gained = np.cumsum(np.where(events.kind == EXPOSURE, events.amount, 0.0))
    first = np.searchsorted(events.unit, events.unit, side="left")
    return np.asarray(gained - np.concatenate([[0.0], gained])[first])


def _up_to(target: Target, life: Sequence[Event]) -> list[Event]:
    """Without what came later: of calibrations at the very same moment, only the target."""
    return [
        event
        for event in life
        if event is target.event
        or event.at < target.event.at
        or (event.at == target.event.at and event.sheet is not sheets.CALIBRATIONS)
    ]


def _last_reading(events: Events) -> Integers:
    """(U,) row of each unit's last reading: the target."""
    rows = np.flatnonzero(events.kind == READING)
    last = np.zeros(len(events.units), dtype=np.int64)
    np.maximum.at(last, events.unit[rows], rows)
    return last


def _cut(events: Events, last: Integers) -> Events:
    """The target itself and what may follow it taken away."""
    kept = np.arange(len(events.unit)) < last[events.unit]
    columns = {name: getattr(events, name)[kept] for name in ("unit", "kind", "which", "amount", "se")}
    return replace(events, **columns)


def _own_past(events: Events, hours: Floats, last: Integers) -> tuple[Floats, Floats]:
    """Exposure and reading of each unit's readings before its target, padded in front with NaN."""
    own = [np.flatnonzero((events.kind == READING) & (events.unit == u))[:-1] for u in range(len(last))]
    size = max(len(rows) for rows in own)
    found = np.full((2, len(own), size), np.nan)
    for u, rows in enumerate(own):
        if len(rows):
            found[:, u, -len(rows) :] = hours[rows], events.amount[rows]
    return found[0], found[1]


def _ran(events: Events, last: Integers) -> NDArray[np.bool_]:
    found = np.zeros(len(last), dtype=bool)
    for u, end in enumerate(last):
        start = np.flatnonzero((events.kind[:end] == READING) & (events.unit[:end] == u))
        between = events.kind[start[-1] + 1 : end] if len(start) else events.kind[:0]
        found[u] = bool(np.any(between == EXPOSURE)) and not np.any(between == RENEWAL)
    return found


def _reference(target: Target, life: Sequence[Event]) -> int:
    earlier = [event for event in life if event is not target.event]
    first = lives.reference(earlier, target.event.row["analyte"], target.waveform)
    places = [place for place, event in enumerate(target.earlier) if first and event.at >= first.at]
    return places[0] if places else -1
