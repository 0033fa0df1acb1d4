"""The kept fit of a cohort: made when first asked for, used at once, made again when enough has changed."""

from __future__ import annotations

import math
from contextlib import suppress
from dataclasses import dataclass

from electrolog.answers import cohorts
from electrolog.answers import figures as made
from electrolog.answers.cohorts import Cohort
from electrolog.errors import DataError
from electrolog.fouling.cohort import fit_cohort
from electrolog.fouling.fit import METHOD, CohortFit
from electrolog.fouling.kept import from_dict, to_dict
from electrolog.fouling.parameters import read_scales
from electrolog.record import queries
from electrolog.record.names import Names
from electrolog.record.readable import row_by_id
from electrolog.record.sheets import ANALYTES, WAVEFORMS
from electrolog.record.store import Connection, Record

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


def gathered(record: Record, asked: Assay) -> Cohort:
    """The whole cohort of the assay's analyte: every probe, retired ones too, with every waveform."""
    with record.reading() as connection:
        probes = queries.probes(connection)
        life = queries.events(connection)
        found = queries.calibrations(connection, None, asked.analyte_id)
    return cohorts.gather(probes, life, made.all_figures(record, found), asked.analyte)


def is_kept(record: Record, analyte: str) -> bool:
    """Whether a fit is kept that `fit_for` would use, so that asking costs nothing. Raises UnknownName."""
    with record.reading() as connection:
        analyte_id = Names(connection).row_id("analytes", analyte)
        kept = queries.kept_fit(connection, analyte_id)
        seen = queries.to_be_seen(connection, analyte_id)
    return kept is not None and kept.method == METHOD and not _changed(kept.seen, seen)


def fit_for(record: Record, asked: Assay, fresh: bool = False) -> CohortFit:
    """The cohort's fit, from the record if what it saw is still nearly all there is."""
    with record.reading() as connection:
        kept = None if fresh else queries.kept_fit(connection, asked.analyte_id)
        seen = queries.to_be_seen(connection, asked.analyte_id)
    if kept is not None and kept.method == METHOD and not _changed(kept.seen, seen):
        with suppress(DataError):  # of a layout that this version can't read
            return from_dict(kept.fit)
    fit = fit_cohort(gathered(record, asked).events)
    keep(record, asked.analyte_id, fit, seen)
    return fit


def keep(record: Record, analyte_id: int, fit: CohortFit, seen: queries.Seen) -> None:
    if not record.may_keep:
        return
    with record.writing() as writer:
        queries.keep_fit(writer, analyte_id, fit.method, fit.fingerprint, seen, to_dict(fit))


def reading_sd_log(fit: CohortFit) -> float:
    """How far one calibration strays from the truth, in log units: its own scatter and its day's."""
    likeliest = max(fit.components, key=lambda part: part.weight)
    scales = read_scales(likeliest.layout, likeliest.theta)
    return math.hypot(float(scales.residual_sd), float(scales.day_sd))


def known_renewals(fit: CohortFit) -> tuple[str, ...]:
    return fit.components[0].layout.renewals


def _changed(kept: queries.Seen, now: queries.Seen) -> bool:
    """A correction may touch anything, so it always counts; new readings count by their share."""
    new = abs(now.readings - kept.readings)
    return now.correction != kept.correction or new > CHANGED_ENOUGH * max(kept.readings, 1)
