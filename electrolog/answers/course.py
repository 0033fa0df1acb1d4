"""The course of a probe's sensitivity: what was read, what is believed of the truth, and what is ahead of it."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from datetime import datetime

import numpy as np

from electrolog.answers import fits, history
from electrolog.answers import life as lives
from electrolog.answers.answer import Answer
from electrolog.answers.asked import Asked, Floats, Run, ask
from electrolog.answers.checking import Demands, limits_in_force
from electrolog.answers.cohorts import REFERENCE_SETTING
from electrolog.answers.history import Reading
from electrolog.clock import utc_now
from electrolog.record import queries, sheets
from electrolog.record.queries import Event
from electrolog.record.store import Record

QUANTILES = (0.05, 0.5, 0.95)
LEAST_SHARE = "least-share-left"
AHEAD_MIN = 240.0
_STEPS = 12
MARKED = (sheets.COATINGS, sheets.CLEANINGS, sheets.RECUTS, sheets.EXPOSURES, sheets.RETIREMENTS)


@dataclass(frozen=True)
class Held:
    """5, 50 and 95 % quantiles of the true sensitivity (nA/µM) at an exposure (hours, all settings)."""

    exposure_h: float
    low_na_um: float
    median_na_um: float
    high_na_um: float


@dataclass(frozen=True)
class Mark:
    """Something that was done to the probe, at the exposure it had by then (a run: at its end)."""

    at: datetime
    exposure_h: float
    what: str
    said: str


@dataclass(frozen=True)
class Course(Answer):
    """One probe with one analyte and waveform, oldest reading first.

    believed: the truth at the readings that the fit used. ahead: from now on, in `setting`; empty where `why_not_ahead`
    says why. limit_na_um: the lab's least share of the reference's true sensitivity (its median); None: not set, or
    nothing to take it of.
    """

    electrode: str
    analyte: str
    waveform: str
    readings: tuple[Reading, ...]
    marks: tuple[Mark, ...]
    exposure_h: float
    believed: tuple[Held, ...]
    ahead: tuple[Held, ...]
    setting: str
    limit_na_um: float | None
    limit_share: float | None
    why_not_ahead: str


@dataclass(frozen=True)
class Ahead:
    """How far to look: `setting` None: the one that the probe was last in."""

    setting: str | None = None
    run_min: float = AHEAD_MIN


def courses(
    record: Record,
    labels: Sequence[str],
    analyte: str | None = None,
    waveform: str | None = None,
    ahead: Ahead | None = None,
    moment: datetime | None = None,
) -> list[Course]:
    """One per probe, analyte and waveform with a calibration. No cohort is fitted for it: only a kept fit is used."""
    moment, ahead = moment or utc_now(), ahead or Ahead()
    found = history.readings(record, labels, analyte, waveform)
    groups: dict[tuple[str, str, str], list[Reading]] = {}
    for reading in found:
        groups.setdefault((reading.electrode, reading.analyte, reading.waveform), []).append(reading)
    with record.reading() as connection:
        ids = [probe["id"] for probe in queries.probes(connection, labels)] if labels else []
        life = queries.events(connection, ids)
    return [_course(record, key, groups[key], life[key[0]], ahead, moment) for key in groups]


def _course(
    record: Record,
    key: tuple[str, str, str],
    readings: Sequence[Reading],
    life: list[Event],
    ahead: Ahead,
    moment: datetime,
) -> Course:
    past = lives.until(life, moment)
    setting = ahead.setting or _last_setting(past)
    asked, why_not = _asked(record, key, setting, ahead.run_min, moment)
    share = None if asked is None else limits_of(record, asked)
    return Course(
        *key,
        readings=tuple(readings),
        marks=tuple(_mark(event, past) for event in past if event.sheet in MARKED),
        exposure_h=_hours(past, moment),
        believed=() if asked is None else _believed(asked, readings),
        ahead=() if asked is None or why_not else _ahead(asked, _hours(past, moment), ahead.run_min),
        setting=setting,
        limit_na_um=None if asked is None else _limit(asked, share),
        limit_share=share,
        why_not_ahead=why_not,
    )


def _last_setting(past: Sequence[Event]) -> str:
    runs = lives.of(past, sheets.EXPOSURES)
    return str(runs[-1].row["setting"]) if runs else REFERENCE_SETTING


def _asked(
    record: Record, key: tuple[str, str, str], setting: str, run_min: float, moment: datetime
) -> tuple[Asked | None, str]:
    electrode, analyte, waveform = key
    if not fits.is_kept(record, analyte):
        return (
            None,
            f"no fit of the cohort is at hand: `electrolog fit --analyte {analyte}` makes one",
        )
    asked = ask(record, [electrode], Run(analyte, waveform, setting, run_min), moment)
    retired = lives.state(asked.life[electrode], moment).retired_at is not None
    return asked, "the probe is retired" if retired else ""


def limits_of(record: Record, asked: Asked) -> float | None:
    with record.reading() as connection:
        return limits_in_force(queries.limits(connection), asked, Demands()).value(LEAST_SHARE)


def _limit(asked: Asked, share: float | None) -> float | None:
    reference = asked.reference_draws(0)
    return None if share is None or reference is None else share * float(np.median(reference))


def _believed(asked: Asked, readings: Sequence[Reading]) -> tuple[Held, ...]:
    hours = {reading.calibration: sum(reading.exposure_h.values()) for reading in readings}
    used = [event.row["calibration"] for event in asked.cohort.readings[asked.labels[0], asked.assay.waveform]]
    return tuple(
        _held(hours[name], asked.posterior.log_sensitivity_at_reading(np.array([place]))[0])
        for place, name in enumerate(used)
        if name in hours
    )


def _ahead(asked: Asked, now_h: float, run_min: float) -> tuple[Held, ...]:
    lengths = np.linspace(0.0, run_min, _STEPS + 1)
    return tuple(
        _held(now_h + minutes / 60, asked.posterior.log_sensitivity(asked.extra_hours(float(minutes)))[0])
        for minutes in lengths
    )


def _held(exposure_h: float, log_sensitivity: Floats) -> Held:
    return Held(float(exposure_h), *np.exp(np.quantile(log_sensitivity, QUANTILES)).tolist())


def _mark(event: Event, past: Sequence[Event]) -> Mark:
    at = lives.end_of(event) if event.sheet is sheets.EXPOSURES else event.at
    row = event.row
    words = {
        sheets.COATINGS.name: row.get("material"),
        sheets.CLEANINGS.name: row.get("method"),
        sheets.EXPOSURES.name: row.get("setting"),
        sheets.RETIREMENTS.name: row.get("reason"),
    }
    return Mark(event.at, _hours(past, at), event.sheet.one, str(words.get(event.sheet.name) or ""))


def _hours(past: Sequence[Event], moment: datetime) -> float:
    return sum(lives.exposure_h(past, moment).values())
