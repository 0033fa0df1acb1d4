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
from electrolog.answers.cohorts import REFERENCE_SETTING, Cohort, coating, gather
from electrolog.answers.fits import Assay
from electrolog.answers.history import must_be_known
from electrolog.clock import utc_now
from electrolog.errors import InputError
from electrolog.measure.calibrate import CalibrationFigures
from electrolog.record import queries, sheets
from electrolog.record.names import Names
from electrolog.record.queries import Event
from electrolog.record.readable import Row
from electrolog.record.store import Connection, Record

if TYPE_CHECKING:
    from electrolog.fouling.fit import CohortFit
    from electrolog.fouling.forecast import Posterior

Floats = NDArray[np.float64]
LONGEST_RUN_MIN = 8760 * 60.0


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
        if self.run_min > LONGEST_RUN_MIN:
            raise InputError(f"run: {self.run_min / 60:.6g} h is longer than a year; accepted: up to 8760h")


@dataclass(frozen=True)
class Asked:
    """Probes asked about, with the posterior of each: rows of its draws are in the order of `labels`.

    `life` is what had happened by the moment asked, `ahead` what the record holds after it.
    """

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
    ahead: dict[str, list[Event]]
    moment: datetime

    def after(self, renewal: str) -> Posterior:
        """The posterior if each unit were renewed so now."""
        return self.posterior.renewed(renewal)

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

    def log_references(self) -> Floats:
        """(U, D) true log sensitivity of every unit at its reference calibration; rows of NaN where it has none."""
        which = [self.reference_reading(label) for label in self.labels]
        has = np.array([place for place, reading in enumerate(which) if reading is not None], dtype=np.int64)
        readings = np.array([reading for reading in which if reading is not None], dtype=np.int64)
        found = np.full(self.posterior.log_sensitivity(self.extra_hours(0.0)).shape, np.nan)
        if has.size:
            found[has] = self.posterior.only(has).log_sensitivity_at_reading(readings)
        return found

    def unseen(self, label: str) -> tuple[str, ...]:
        """What the fit has never seen, so that the forecast takes its widest assumption; in words."""
        seen = self.fit.summary["half_lives"]
        film = coating(self.life[label])
        said = []
        if self.setting not in self.fit.components[0].layout.settings and self.setting != REFERENCE_SETTING:
            said.append(f"nothing was ever logged in {self.setting}: how fast it fouls there is the widest assumption")
        if self.assay.waveform not in {row["waveform"] for row in seen}:
            said.append(f"no probe was ever calibrated with {self.assay.waveform}: what it does is assumed")
        if film not in {row["coating"] for row in seen}:
            bare = "no bare probe" if film == "none" else f"no probe coated with {film}"
            said.append(f"{bare} was ever calibrated with {self.assay.analyte}: how fast it fouls is assumed")
        return tuple(said)

    def blanks_na(self, calibration: Event) -> list[float]:
        """Currents at zero concentration of one calibration."""
        return [current for concentration, current in self.points[calibration.row["id"]] if concentration == 0]

    def said_of(self, label: str) -> tuple[str, ...]:
        """What this probe's own calibrations could not tell the fit."""
        own = [event.row["calibration"] for event in lives.of(self.life[label], sheets.CALIBRATIONS)]
        return tuple(f"{name} is left out: {why}" for name, why in self.cohort.left_out.items() if name in own)


def ask(
    record: Record,
    labels: Sequence[str] | None,
    run: Run,
    moment: datetime | None = None,
    more_settings: Sequence[str] = (),
) -> Asked:
    """Reads what is known of the probes (None: of all that aren't retired) and brings the kept fit up to each.

    more_settings: others that will be asked about, as the record spells them. Raises UnknownName.
    """
    moment = moment or utc_now()
    with record.reading() as connection:
        chosen = fits.assay(connection, run.analyte, run.waveform)
        setting = Names(connection).word("setting", run.setting)
        probes = _usable(connection, moment) if labels is None else _named(connection, labels)
        ids = [probe["id"] for probe in probes]
        found = queries.calibrations(connection, ids, chosen.analyte_id)
        told = queries.events(connection, ids)
    order = tuple(probe["electrode"] for probe in probes)
    story = {label: lives.until(told.get(label, ()), moment) for label in order}
    ahead = {label: told.get(label, [])[len(story[label]) :] for label in order}
    units = [(label, chosen.waveform) for label in order]
    fit = fits.fit_for(record, chosen, units=units)
    figures = made.all_figures(record, found)
    cohort = gather(probes, story, figures, chosen.analyte, units, (REFERENCE_SETTING, setting, *more_settings))
    from electrolog.fouling.forecast import posterior

    by_label = {probe["electrode"]: probe for probe in probes}
    drawn = posterior(fit, cohort.events)
    points = {one.row["id"]: one.points for one in found}
    return Asked(chosen, setting, fit, cohort, drawn, figures, points, order, by_label, story, ahead, moment)


def _named(connection: Connection, labels: Sequence[str]) -> list[Row]:
    """In the order named. Raises UnknownName."""
    found = {probe["electrode"]: probe for probe in queries.probes(connection, labels)} if labels else {}
    must_be_known(Names(connection), labels, list(found.values()))
    return [found[label] for label in dict.fromkeys(labels) if label in found]


def _usable(connection: Connection, moment: datetime) -> list[Row]:
    ended = queries.events(connection, None, (sheets.RETIREMENTS,))
    gone = {label for label, life in ended.items() if life[0].at <= moment}
    return [probe for probe in queries.probes(connection) if probe["electrode"] not in gone]
