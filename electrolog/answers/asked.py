"""Which units a forecast or a check is about, where each stands, and what its fit makes of it."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from datetime import datetime
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from electrolog.answers import figures as made
from electrolog.answers import fits
from electrolog.answers import life as lives
from electrolog.answers.cohorts import REFERENCE_SETTING, Cohort, gather
from electrolog.answers.fits import Assay
from electrolog.clock import utc_now
from electrolog.errors import InputError
from electrolog.measure.calibrate import CalibrationFigures
from electrolog.record import queries, sheets
from electrolog.record.names import Names
from electrolog.record.queries import Event
from electrolog.record.readable import Row
from electrolog.record.store import Record

if TYPE_CHECKING:
    from electrolog.fouling.fit import CohortFit
    from electrolog.fouling.forecast import Posterior

Floats = NDArray[np.float64]


@dataclass(frozen=True)
class Run:
    """A planned run: what it is to detect, with which waveform, where, for how long."""

    analyte: str
    waveform: str
    setting: str
    run_min: float

    def __post_init__(self) -> None:
        if not self.run_min > 0:
            raise InputError(f"run: {self.run_min:g} min is no run; accepted: longer than zero, such as 4h")


@dataclass(frozen=True)
class Asked:
    """Probes asked about, with the posterior of each: rows of its draws are in the order of `labels`."""

    assay: Assay
    setting: str
    fit: CohortFit
    cohort: Cohort
    posterior: Posterior
    figures: dict[int, CalibrationFigures]
    points: dict[int, tuple[tuple[float, float], ...]]
    labels: tuple[str, ...]
    probes: dict[str, Row]
    life: dict[str, list[Event]]
    moment: datetime

    def extra_hours(self, run_min: float) -> Floats:
        """(U, S) hours that a run of that length adds."""
        hours = np.zeros((len(self.labels), len(self.cohort.events.settings)))
        hours[:, self.cohort.events.settings.index(self.setting)] = run_min / 60
        return hours

    def reference_reading(self, label: str) -> int | None:
        """Which of the unit's readings is its reference; None when there is none."""
        first = lives.reference(self.life[label], self.assay.analyte, self.assay.waveform, self.moment)
        readings = self.cohort.readings[label, self.assay.waveform]
        places = [place for place, event in enumerate(readings) if first and event.at >= first.at]
        return places[0] if places else None

    def reference_draws(self, place: int) -> Floats | None:
        """(D,) true sensitivity (nA/µM) of one unit when its reference calibration was taken."""
        which = self.reference_reading(self.labels[place])
        if which is None:
            return None
        alone = self.posterior.only(np.array([place]))
        found: Floats = np.exp(alone.log_sensitivity_at_reading(np.array([which]))[0])
        return found

    def blanks_na(self, calibration: Event) -> list[float]:
        """Currents at zero concentration of one calibration."""
        return [current for concentration, current in self.points[calibration.row["id"]] if concentration == 0]

    def said_of(self, label: str) -> tuple[str, ...]:
        """What this probe's own calibrations could not tell the fit."""
        own = [event.row["calibration"] for event in lives.of(self.life[label], sheets.CALIBRATIONS)]
        return tuple(f"{name} is left out: {why}" for name, why in self.cohort.left_out.items() if name in own)


def ask(record: Record, labels: Sequence[str], run: Run, moment: datetime | None = None) -> Asked:
    """Reads what is known of the probes and brings the kept fit up to each. Raises UnknownName."""
    moment = moment or utc_now()
    with record.reading() as connection:
        chosen = fits.assay(connection, run.analyte, run.waveform)
        setting = Names(connection).word("setting", run.setting)
        probes = queries.probes(connection, labels)
        ids = [probe["id"] for probe in probes]
        found = queries.calibrations(connection, ids, chosen.analyte_id)
        life = {label: lives.until(events, moment) for label, events in queries.events(connection, ids).items()}
    order = tuple(probe["electrode"] for probe in probes)
    story = {label: life.get(label, []) for label in order}
    fit = fits.fit_for(record, chosen)
    figures = made.all_figures(record, found)
    units = [(label, chosen.waveform) for label in order]
    cohort = gather(probes, story, figures, chosen.analyte, units, (REFERENCE_SETTING, setting))
    from electrolog.fouling.forecast import posterior

    by_label = {probe["electrode"]: probe for probe in probes}
    drawn = posterior(fit, cohort.events)
    points = {one.row["id"]: one.points for one in found}
    return Asked(chosen, setting, fit, cohort, drawn, figures, points, order, by_label, story, moment)
