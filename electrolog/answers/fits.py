"""The kept fit of a cohort: made when first asked for, used at once, made again when enough has changed."""

from __future__ import annotations

import math
from collections.abc import Sequence
from contextlib import suppress
from dataclasses import dataclass

from electrolog.answers import cohorts
from electrolog.answers import figures as made
from electrolog.answers.cohorts import Cohort, Gathering, UnitKey
from electrolog.errors import DataError
from electrolog.fouling.cohort import fit_cohort
from electrolog.fouling.fit import METHOD, CohortFit
from electrolog.fouling.kept import from_dict, to_dict
from electrolog.fouling.parameters import read_scales
from electrolog.measure.calibrate import CalibrationFigures
from electrolog.record import kept_fits, queries, seen_by_fit, sheets
from electrolog.record.names import Names
from electrolog.record.queries import Event
from electrolog.record.readable import Row, row_by_id
from electrolog.record.sheets import ANALYTES, WAVEFORMS
from electrolog.record.store import Connection, Record

PROBES_AT_ONCE = 500
# What else happened to a probe changes none of its readings.
OF_THE_FIT = tuple(sheet for sheet in sheets.EVENTS if sheet not in (sheets.CONDITIONINGS, sheets.RETIREMENTS))
CHANGED_ENOUGH = 0.05  # of the readings; below that one probe's own news reach its forecast without a new fit


@dataclass(frozen=True)
class Assay:
    """Analyte and waveform by the record's own spelling: what is comparable."""

    analyte: str
    waveform: str
    analyte_id: int

    @property
    def said(self) -> str:
        return f"{self.analyte} and {self.waveform}"


def assay(connection: Connection, analyte: str, waveform: str) -> Assay:
    """Raises UnknownName."""
    names = Names(connection)
    analyte_id = names.row_id("analytes", analyte)
    waveform_id = names.row_id("waveforms", waveform)
    spelled = row_by_id(connection, ANALYTES, analyte_id)["analyte"]
    return Assay(spelled, row_by_id(connection, WAVEFORMS, waveform_id)["waveform"], analyte_id)


def gathered(record: Record, asked: Assay) -> tuple[Cohort, seen_by_fit.Seen]:
    """The whole cohort of the assay's analyte: every probe, retired ones too, with every waveform; `readings` is empty.

    With it how much of the record that is. A stretch of probes at a time, so that what is held of a large cohort is its
    columns of numbers.
    """
    gathering = Gathering(asked.analyte)
    with record.reading() as connection:
        seen = seen_by_fit.to_be_seen(connection, asked.analyte_id)
        members = queries.calibrated_with(connection, asked.analyte_id)
        for start in range(0, len(members), PROBES_AT_ONCE):
            gathering.add(*_stretch(connection, asked, members[start : start + PROBES_AT_ONCE]))
    return gathering.done(), seen


def _stretch(
    connection: Connection, asked: Assay, ids: Sequence[int]
) -> tuple[list[Row], dict[str, list[Event]], dict[int, CalibrationFigures]]:
    probes, life = queries.probes_by_id(connection, ids), queries.events(connection, ids, OF_THE_FIT)
    found = queries.calibrations(connection, ids, asked.analyte_id, points=False)
    return probes, life, made.figures_without_points(connection, found)


def calibration_of(record: Record, asked: Assay, unit: UnitKey, place: int) -> str:
    """The label of a unit's reading by its place among those that the fit uses; "?" where it is gone by now."""
    with record.reading() as connection:
        ids = [probe["id"] for probe in queries.probes(connection, [unit[0]])]
        told = _stretch(connection, asked, ids)
    readings = cohorts.gather(*told, asked.analyte, [unit]).readings[unit] if ids else []
    return str(readings[place].row["calibration"]) if place < len(readings) else "?"


def is_kept(record: Record, analyte: str) -> bool:
    """Whether a fit is kept that `fit_for` would use, so that asking costs nothing. Raises UnknownName."""
    with record.reading() as connection:
        return _still_holds(connection, Names(connection).row_id("analytes", analyte))


def fit_for(
    record: Record,
    asked: Assay,
    fresh: bool = False,
    known: tuple[Cohort, seen_by_fit.Seen] | None = None,
    units: Sequence[UnitKey] | None = None,
) -> CohortFit:
    """The cohort's fit, from the record if what it saw is still nearly all there is.

    known: as just gathered. units: those that will be forecast, whose own share is to be taken out; None: any.
    """
    labels = None if units is None else [cohorts.unit_label(unit) for unit in units]
    with record.reading() as connection:
        if not fresh and _still_holds(connection, asked.analyte_id):
            with suppress(DataError):  # spoilt, or of a layout that this version can't read
                return from_dict(kept_fits.content(connection, asked.analyte_id, labels))
    cohort, seen = known or gathered(record, asked)
    fit = fit_cohort(cohort.events)
    keep(record, asked.analyte_id, fit, seen)
    return fit


def corrected_last(record: Record, asked: Assay) -> int:
    """The journal entry up to which no correction of the cohort is unknown to its fit, or the newest such one."""
    with record.reading() as connection:
        kept = kept_fits.kept_fit(connection, asked.analyte_id)
        if kept is None:
            return seen_by_fit.to_be_seen(connection, asked.analyte_id).correction
        return seen_by_fit.since(connection, asked.analyte_id, kept.seen).correction or kept.seen.correction


def keep(record: Record, analyte_id: int, fit: CohortFit, seen: seen_by_fit.Seen) -> None:
    if not record.may_keep:
        return
    ready = kept_fits.sealed(analyte_id, fit.method, fit.fingerprint, seen, to_dict(fit))
    with record.writing() as writer:
        kept_fits.keep_fit(writer, ready)


def reading_sd_log(fit: CohortFit) -> float:
    """How far one calibration strays from the truth, in log units: its own scatter and its day's."""
    likeliest = max(fit.components, key=lambda part: part.weight)
    scales = read_scales(likeliest.layout, likeliest.theta)
    return math.hypot(float(scales.residual_sd), float(scales.day_sd))


def known_renewals(fit: CohortFit) -> tuple[str, ...]:
    return fit.components[0].layout.renewals


def _still_holds(connection: Connection, analyte_id: int) -> bool:
    """Whether a fit is kept and holds: a correction of its cohort always counts, new readings by their share."""
    kept = kept_fits.kept_fit(connection, analyte_id)
    if kept is None or kept.method != METHOD:
        return False
    since = seen_by_fit.since(connection, analyte_id, kept.seen)
    return not since.correction and since.readings <= CHANGED_ENOUGH * max(kept.seen.readings, 1)
