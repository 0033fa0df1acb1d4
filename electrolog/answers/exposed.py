"""The exposure that a recording was made in, and a probe's life cut off at every moment of it."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace
from datetime import datetime, timedelta

import numpy as np
from numpy.typing import NDArray

from electrolog.answers import life as lives
from electrolog.answers.cohorts import gather
from electrolog.clock import shown_moment
from electrolog.errors import DataError, InputError
from electrolog.fouling.events import Events
from electrolog.measure.calibrate import CalibrationFigures
from electrolog.record import sheets
from electrolog.record.queries import Event
from electrolog.record.readable import Row

Floats = NDArray[np.float64]
MOST_LISTED = 8
OVERTIME_S, OVERTIME_SHARE = 300.0, 0.05  # a recording may outlast its exposure's entry by the larger of the two


@dataclass(frozen=True)
class Asked:
    """Which exposure is meant: its number, or the moment at which the recording's time is zero, or the file's name."""

    number: int | None
    start: datetime | None
    recording: str


def find(life: Sequence[Event], asked: Asked) -> Event:
    """Raises InputError, listing the exposures there are, unless exactly one is meant."""
    every = lives.of(life, sheets.EXPOSURES)
    if not every:
        raise DataError("the probe has no exposure on record", "log the run first: electrolog expose")
    if asked.number is not None:
        found = [event for event in every if event.row["id"] == asked.number]
        said = f"no exposure {asked.number} of this probe"
    elif asked.start is not None:
        start = asked.start
        found = [event for event in every if event.at <= start < lives.end_of(event)]
        said = f"{'several exposures are' if len(found) > 1 else 'no exposure is'} under way at {shown_moment(start)}"
    else:
        found = [event for event in every if event.row["recording"] == asked.recording]
        found = every if not found and len(every) == 1 else found
        said = "which exposure is it? none is named by --exposure or --start, nor noted with this recording"
    if len(found) != 1:
        raise InputError(f"{said}; known: {_listed(every)}", "name one: --exposure NUMBER, or --start TIME")
    return found[0]


def _listed(every: Sequence[Event]) -> str:
    """The latest ones."""
    said = [f"{event.row['id']} ({shown_moment(event.at)}, {event.row['setting']})" for event in every[-MOST_LISTED:]]
    return ("…, " if len(every) > MOST_LISTED else "") + ", ".join(said)


def span_s(run: Event, start: datetime, time_s: Floats) -> tuple[float, float]:
    """The run in the recording's own seconds. Raises InputError where the recording can't have been made in it."""
    first = (run.at - start) / timedelta(seconds=1)
    last = first + run.row["duration_min"] * 60
    spare = max(OVERTIME_S, OVERTIME_SHARE * (last - first))
    if time_s[0] < first - spare or time_s[-1] > last + spare:
        raise InputError(
            f"the recording runs from {time_s[0]:.6g} to {time_s[-1]:.6g} s; exposure {run.row['id']} lasted from"
            f" {first:.6g} to {last:.6g} s of its clock",
            "was it another run, or does its time start elsewhere? give --start; or amend the exposure's duration",
        )
    return first, last


@dataclass(frozen=True)
class Moments:
    """A life cut off at T moments, as T units; passed (T,): see fouling/conversion.py."""

    events: Events
    passed: Floats


@dataclass(frozen=True)
class Story:
    """One probe; `readings` are the calibrations of its life that the fit can use."""

    probe: Row
    life: Sequence[Event]
    figures: Mapping[int, CalibrationFigures]
    readings: Sequence[Event]


def cut_at(moments: Sequence[datetime], story: Story, unit: tuple[str, str], known: Events) -> Moments:
    """unit: analyte, waveform. known: the events of the whole life, whose order of settings is kept."""
    analyte, waveform = unit
    alone = [{**story.probe, "electrode": str(k)} for k in range(len(moments))]
    cut = {str(k): _until(story.life, moment) for k, moment in enumerate(moments)}
    units = [(row["electrode"], waveform) for row in alone]
    events = gather(alone, cut, story.figures, analyte, units, known.settings).events
    readings = [event.at for event in story.readings]
    return Moments(events, np.array([_passed(moment, story.life, readings) for moment in moments]))


def _until(life: Sequence[Event], moment: datetime) -> list[Event]:
    """What had happened by then; of an exposure under way, its part until then."""
    past = lives.until(life, moment)
    return [_shortened(event, moment) if event.sheet is sheets.EXPOSURES else event for event in past]


def _shortened(exposure: Event, moment: datetime) -> Event:
    minutes = (min(lives.end_of(exposure), moment) - exposure.at) / timedelta(minutes=1)
    return replace(exposure, row={**exposure.row, "duration_min": minutes})


def _passed(moment: datetime, life: Sequence[Event], readings: Sequence[datetime]) -> float:
    """Of the exposure between the readings around a moment, the share before it; with none after it, one."""
    before = max((at for at in readings if at <= moment), default=None)
    after = min((at for at in readings if at > moment), default=None)
    if after is None:
        return 1.0
    start = 0.0 if before is None else _hours(life, before)
    whole = _hours(life, after) - start
    return (_hours(life, moment) - start) / whole if whole > 0 else 1.0


def _hours(life: Sequence[Event], moment: datetime) -> float:
    return sum(lives.exposure_h(life, moment).values())
