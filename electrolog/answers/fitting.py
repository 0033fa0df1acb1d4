"""What a lab's probes have taught the fit of their cohort: the kept fit's own summary, in the record's names."""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass
from datetime import datetime
from typing import Any

from electrolog.answers import fits
from electrolog.answers.answer import Answer
from electrolog.answers.cohorts import Cohort
from electrolog.answers.fits import Assay
from electrolog.errors import DataError
from electrolog.fouling.events import READING
from electrolog.fouling.fit import CohortFit
from electrolog.record import kept_fits
from electrolog.record.names import Names
from electrolog.record.readable import row_by_id
from electrolog.record.sheets import ANALYTES
from electrolog.record.store import Connection, Record


@dataclass(frozen=True)
class Estimate:
    """Median and central 90 % interval; None: infinite, as a half-life that is never reached."""

    median: float | None
    low: float | None
    high: float | None


@dataclass(frozen=True)
class HalfLife:
    """Hours in vivo until a typical probe of this kind has lost half of its sensitivity."""

    coating: str
    waveform: str
    hours: Estimate
    probes: int
    calibrations: int


@dataclass(frozen=True)
class Setting:
    """How fast a setting fouls, in vivo being one; `exposure_h` over all probes."""

    setting: str
    weight: Estimate
    exposure_h: float
    probes: int


@dataclass(frozen=True)
class Recovery:
    """The share of the fouling that a renewal undoes."""

    method: str
    share: Estimate
    times: int
    probes: int


@dataclass(frozen=True)
class Day:
    """By how much all readings with a standard, on a rig, on a date stood too high (+) or too low, as a share."""

    standard: str
    rig: str
    date: str
    effect: Estimate
    calibrations: int
    p_bad: float
    suspicious: bool


@dataclass(frozen=True)
class Odd:
    """What doesn't fit a probe's fouling: a slip at a calibration, or damage before it."""

    electrode: str
    calibration: str
    probability: float


@dataclass(frozen=True)
class FittedCohort(Answer):
    """spreads: standard deviations in log units, by what they are of. probes: one per waveform it was seen with."""

    analyte: str
    method: str
    made_at: datetime
    converged: bool
    probes: int
    calibrations: int
    shapes: dict[str, float]
    half_lives: tuple[HalfLife, ...]
    settings: tuple[Setting, ...]
    recoveries: tuple[Recovery, ...]
    days: tuple[Day, ...]
    spreads: dict[str, Estimate]
    slips: tuple[Odd, ...]
    damaged: tuple[Odd, ...]
    notes: tuple[str, ...]

    @property
    def suspicious_days(self) -> tuple[Day, ...]:
        return tuple(day for day in self.days if day.suspicious)


def whole_cohort(connection: Connection, analyte: str) -> Assay:
    """The analyte with every waveform. Raises UnknownName."""
    analyte_id = Names(connection).row_id("analytes", analyte)
    return Assay(row_by_id(connection, ANALYTES, analyte_id)["analyte"], "", analyte_id)


def fitted_cohort(record: Record, analyte: str, fresh: bool = False) -> FittedCohort:
    """The kept fit, made if there is none or the record has changed enough; `fresh` makes it whatever is kept.

    Raises UnknownName, and DataError where nothing was calibrated with the analyte.
    """
    with record.reading() as connection:
        asked = whole_cohort(connection, analyte)
    cohort, seen = fits.gathered(record, asked)
    if not (cohort.events.kind == READING).any():
        raise DataError(
            f"no calibration with {asked.analyte} gives a sensitivity: there is nothing to fit",
            "log calibrations with `electrolog calibrate`, or `electrolog import` a folder",
        )
    fit = fits.fit_for(record, asked, fresh, (cohort, seen))
    with record.reading() as connection:
        kept = kept_fits.kept_fit(connection, asked.analyte_id)
    if kept is None:
        raise DataError("the fit was taken away while it was read", "ask again")
    return _told(record, asked, fit, cohort, kept.made_at)


def _told(record: Record, asked: Assay, fit: CohortFit, cohort: Cohort, made_at: datetime) -> FittedCohort:
    said = fit.summary
    return FittedCohort(
        analyte=asked.analyte,
        method=fit.method,
        made_at=made_at,
        converged=fit.converged,
        probes=fit.n_units,
        calibrations=fit.n_readings,
        shapes=dict(sorted(fit.shape_weights.items(), key=lambda item: -item[1])),
        half_lives=tuple(_half_life(row) for row in said["half_lives"]),
        settings=tuple(
            Setting(row["setting"], _estimate(row), row["hours"], row["n_probes"]) for row in said["settings"]
        ),
        recoveries=tuple(
            Recovery(row["method"].removeprefix("clean:"), _estimate(row), row["n_renewals"], row["n_probes"])
            for row in said["renewals"]
        ),
        days=tuple(sorted((_day(row) for row in said["days"]), key=lambda day: (day.date, day.standard, day.rig))),
        spreads={name: _estimate(row) for name, row in said["spreads"].items()},
        slips=tuple(_odd(record, asked, row, row["reading"]) for row in said["slips"]),
        damaged=tuple(_odd(record, asked, row, row["before_reading"]) for row in said["damaged"]),
        notes=(*fit.notes, *[f"{name} is left out: {why}" for name, why in cohort.left_out.items()]),
    )


def _estimate(row: Mapping[str, Any]) -> Estimate:
    return Estimate(row["median"], row["low"], row["high"])


def _half_life(row: Mapping[str, Any]) -> HalfLife:
    return HalfLife(row["coating"], row["waveform"], _estimate(row), row["n_probes"], row["n_calibrations"])


def _day(row: Mapping[str, Any]) -> Day:
    standard, rig, date = row["day"].split("\n")
    low, median, high = (math.expm1(row["effect"] + z * row["sd"]) for z in (-1.645, 0.0, 1.645))
    effect = Estimate(median, low, high)
    return Day(standard, rig, date, effect, row["n_calibrations"], row["bad_probability"], row["suspicious"])


def _odd(record: Record, asked: Assay, row: Mapping[str, Any], which: int) -> Odd:
    electrode, waveform = row["unit"].split("\n")
    name = fits.calibration_of(record, asked, (electrode, waveform), which)
    return Odd(electrode, name, row["probability"])
