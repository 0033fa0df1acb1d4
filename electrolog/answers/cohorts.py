"""From the record to what a fit sees: every unit's exposures, renewals and readings in the order of time.

A unit is one probe seen with one waveform, of one analyte. Its readings are the calibrations whose sensitivity has a
logarithm; what is left out is counted and said.
"""

from __future__ import annotations

import math
import sys
from array import array
from collections.abc import Iterable, Iterator, Mapping, Sequence
from dataclasses import dataclass, field
from datetime import timedelta
from typing import Any

import numpy as np

from electrolog.answers import life as lives
from electrolog.fouling.events import EXPOSURE, READING, RENEWAL, Events
from electrolog.measure.calibrate import CalibrationFigures
from electrolog.record import sheets
from electrolog.record.queries import Event
from electrolog.record.readable import Row

UnitKey = tuple[str, str]  # probe, waveform
REFERENCE_SETTING = "in-vivo"
_NOWHERE = math.nan


@dataclass(frozen=True)
class Cohort:
    """Events of the units, the calibrations behind their readings, and what had to be left out, in words."""

    events: Events
    units: tuple[UnitKey, ...]
    readings: dict[UnitKey, list[Event]]
    left_out: dict[str, str]

    def place(self, unit: UnitKey) -> int:
        return self.units.index(unit)


@dataclass
class _Columns:
    """Packed as they come: a large cohort has millions of rows, and a list would hold an object for each number."""

    unit: array[int] = field(default_factory=lambda: array("q"))
    kind: array[int] = field(default_factory=lambda: array("b"))
    which: array[int] = field(default_factory=lambda: array("q"))
    amount: array[float] = field(default_factory=lambda: array("d"))
    se: array[float] = field(default_factory=lambda: array("d"))

    def add(self, unit: int, kind: int, which: int, amount: float, se: float = _NOWHERE) -> None:
        self.unit.append(unit)
        self.kind.append(kind)
        self.which.append(which)
        self.amount.append(amount)
        self.se.append(se)


class _Index:
    """Names in the order of their first appearance."""

    def __init__(self, first: Iterable[str] = ()) -> None:
        self.places = {name: place for place, name in enumerate(dict.fromkeys(first))}

    def place(self, name: str) -> int:
        return self.places.setdefault(name, len(self.places))

    @property
    def names(self) -> tuple[str, ...]:
        return tuple(self.places)


@dataclass(frozen=True)
class _Names:
    settings: _Index
    renewals: _Index
    days: _Index


def unit_label(unit: UnitKey) -> str:
    """As a fit knows it."""
    return "\n".join(unit)


def gather(
    probes: Sequence[Row],
    life: Mapping[str, list[Event]],
    figures: Mapping[int, CalibrationFigures],
    analyte: str,
    units: Sequence[UnitKey] | None = None,
    settings_known: Iterable[str] = (REFERENCE_SETTING,),
) -> Cohort:
    """Events of every probe that was calibrated with the analyte, one unit per waveform; or of the named units.

    A named unit may have no reading yet. `settings_known` come first, whether or not anything was logged in them.
    """
    gathering = Gathering(analyte, settings_known)
    readings = gathering.add(probes, life, figures, units)
    return gathering.done(readings)


class Gathering:
    """A cohort as it is gathered, some probes at a time; only its columns of numbers and its names are held."""

    def __init__(self, analyte: str, settings_known: Iterable[str] = (REFERENCE_SETTING,)) -> None:
        self._analyte = analyte
        self._names = _Names(_Index(settings_known), _Index(), _Index())
        self._columns = _Columns()
        self._units: list[UnitKey] = []
        self._groups: dict[str, list[str]] = {factor: [] for factor in ("coating", "fibre", "waveform", "batch")}
        self._left_out: dict[str, str] = {}

    def add(
        self,
        probes: Sequence[Row],
        life: Mapping[str, list[Event]],
        figures: Mapping[int, CalibrationFigures],
        units: Sequence[UnitKey] | None = None,
    ) -> dict[UnitKey, list[Event]]:
        """The units of these probes behind those gathered so far; returns the calibrations behind their readings."""
        of_probe = {probe["electrode"]: probe for probe in probes}
        readings: dict[UnitKey, list[Event]] = {}
        for electrode, waveform in _units(probes, life, self._analyte) if units is None else units:
            story, probe = life.get(electrode, []), of_probe[electrode]
            usable = self._usable(lives.comparable_calibrations(story, self._analyte, waveform), figures)
            readings[electrode, waveform] = usable
            for step in _steps(story, {event.row["id"] for event in usable}, probe["exposed_length_um"]):
                _write(step, len(self._units), self._columns, figures, self._names)
            self._units.append((electrode, waveform))
            own = (coating(story), probe["fibre"] or "", waveform, probe["batch"] or "")
            for values, value in zip(self._groups.values(), own, strict=True):
                values.append(sys.intern(value))
        return readings

    def _usable(self, found: Sequence[Event], figures: Mapping[int, CalibrationFigures]) -> list[Event]:
        why_not = {event.row["calibration"]: unusable(figures[event.row["id"]]) for event in found}
        self._left_out.update({label: why for label, why in why_not.items() if why})
        return [event for event in found if not why_not[event.row["calibration"]]]

    def done(self, readings: dict[UnitKey, list[Event]] | None = None) -> Cohort:
        """readings: the calibrations behind them, where the cohort is to hold these too."""
        columns, names = self._columns, self._names
        events = Events(
            unit=np.array(columns.unit, dtype=np.int64),
            kind=np.array(columns.kind, dtype=np.int8),
            which=np.array(columns.which, dtype=np.int64),
            amount=np.array(columns.amount, dtype=np.float64),
            se=np.array(columns.se, dtype=np.float64),
            units=tuple(map(unit_label, self._units)),
            settings=names.settings.names,
            renewals=names.renewals.names,
            days=names.days.names,
            groups={factor: tuple(values) for factor, values in self._groups.items()},
        )
        return Cohort(events, tuple(self._units), readings or {}, self._left_out)


def unusable(figures: CalibrationFigures) -> str:
    """Why a calibration gives the fit no reading; empty when it does."""
    sensitivity = figures.sensitivity_na_um
    if sensitivity is None:
        return "gives no sensitivity"
    if sensitivity <= 0:
        return f"its sensitivity is {sensitivity:.3g} nA/µM, which has no logarithm"
    return ""


def _units(probes: Sequence[Row], life: Mapping[str, list[Event]], analyte: str) -> Iterable[UnitKey]:
    return {
        (probe["electrode"], event.row["waveform"]): None
        for probe in probes
        for event in lives.of(life.get(probe["electrode"], []), sheets.CALIBRATIONS)
        if event.row["analyte"] == analyte
    }


@dataclass(frozen=True)
class _Step:
    kind: int
    name: str
    amount: float
    event: Event


def _steps(story: Sequence[Event], readings: set[int], length_um: float | None) -> Iterator[_Step]:
    """The story cut into steps; an exposure that something falls into is split there."""
    marks = [event for event in story if _is_mark(event, readings)]
    begun: list[tuple[Event, Any]] = []  # exposures not yet over, with the moment up to which they are counted
    waiting = [event for event in story if event.sheet is sheets.EXPOSURES]
    touched = False
    for mark in [*marks, None]:
        while waiting and (mark is None or waiting[0].at < mark.at):
            begun.append((waiting[0], waiting[0].at))
            waiting.pop(0)
        for place, (exposure, since) in enumerate(begun):
            end = lives.end_of(exposure) if mark is None else min(lives.end_of(exposure), mark.at)
            if end > since:
                touched = True
                yield _Step(EXPOSURE, exposure.row["setting"], (end - since) / timedelta(hours=1), exposure)
                begun[place] = (exposure, end)
        begun = [(exposure, since) for exposure, since in begun if since < lives.end_of(exposure)]
        if mark is None:
            return
        if mark.sheet is sheets.INSPECTIONS:
            length_um = mark.row["exposed_length_um"]
        elif mark.sheet is sheets.CALIBRATIONS:
            touched = True
            yield _Step(READING, _day(mark), 0.0, mark)
        else:
            after = mark.row.get("exposed_length_um")
            area = math.log(after / length_um) if after and length_um and mark.sheet is sheets.RECUTS else 0.0
            length_um = after or length_um
            if touched:  # a film put on a probe that was never used or measured renews nothing
                yield _Step(RENEWAL, _renewal(mark), area, mark)


def _is_mark(event: Event, readings: set[int]) -> bool:
    if event.sheet is sheets.CALIBRATIONS:
        return event.row["id"] in readings
    if event.sheet is sheets.INSPECTIONS:
        return event.row["exposed_length_um"] is not None
    return event.sheet in lives.RENEWING


def _renewal(event: Event) -> str:
    if event.sheet is sheets.CLEANINGS:
        return f"clean:{event.row['method']}"
    return "recut" if event.sheet is sheets.RECUTS else "recoat"


def _day(event: Event) -> str:
    """What all probes measured together share: the standard, the rig, the date."""
    row = event.row
    return f"{row['standard'] or ''}\n{row['rig'] or ''}\n{event.at.date().isoformat()}"


def _write(
    step: _Step,
    unit: int,
    columns: _Columns,
    figures: Mapping[int, CalibrationFigures],
    names: _Names,
) -> None:
    if step.kind == EXPOSURE:
        columns.add(unit, EXPOSURE, names.settings.place(step.name), step.amount)
    elif step.kind == RENEWAL:
        columns.add(unit, RENEWAL, names.renewals.place(step.name), step.amount)
    else:
        own = figures[step.event.row["id"]]
        sensitivity = own.sensitivity_na_um or _NOWHERE
        relative = own.sensitivity_se_na_um / sensitivity if own.sensitivity_se_na_um is not None else _NOWHERE
        columns.add(unit, READING, names.days.place(step.name), math.log(sensitivity), relative)


def coating(story: Sequence[Event]) -> str:
    """The film on the probe; a probe without a logged one is bare."""
    films = lives.of(story, sheets.COATINGS)
    return str(films[-1].row["material"]) if films else "none"
