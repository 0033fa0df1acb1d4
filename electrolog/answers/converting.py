"""A recording's currents into concentrations, by the sensitivity that the probe had at each moment of the run."""

from __future__ import annotations

import math
from dataclasses import asdict, dataclass
from datetime import datetime, timedelta
from importlib.metadata import version
from pathlib import Path
from typing import Any

import numpy as np
from numpy.typing import NDArray

from electrolog.answers import curves, exposed, fits, remarks, signal_files
from electrolog.answers import figures as made
from electrolog.answers import life as lives
from electrolog.answers.answer import Answer
from electrolog.answers.background import Background, trial
from electrolog.answers.cohorts import Cohort, gather
from electrolog.answers.fits import Assay
from electrolog.clock import iso_utc
from electrolog.errors import DataError, InputError
from electrolog.fouling.background import Trial, resampled
from electrolog.fouling.conversion import band, log_sensitivity_along
from electrolog.fouling.fit import CohortFit
from electrolog.fouling.forecast import posterior
from electrolog.measure.calibrate import CalibrationFigures
from electrolog.measure.recording import checked_clock
from electrolog.record import queries
from electrolog.record.queries import Calibration, Event
from electrolog.record.readable import Row
from electrolog.record.store import Record

Floats = NDArray[np.float64]
MOST_STEPS = 480  # at which the sensitivity is drawn: every minute of eight hours


@dataclass(frozen=True)
class Wanted:
    """What is to be converted, with what it was recorded; `exposure` and `start` say in which run.

    `trace`: its seconds and nA, where they have been read already.
    """

    file: Path
    probe: str
    analyte: str
    waveform: str
    exposure: int | None = None
    start: datetime | None = None
    rate_hz: float | None = None
    background: Background | None = None
    trace: tuple[Floats, Floats] | None = None


@dataclass(frozen=True)
class Spread:
    """Median and central 90 % interval."""

    median: float
    low: float
    high: float


@dataclass(frozen=True)
class FixedFactor:
    """What one calibration's factor alone would have made of it: concentrations off by this share, + too high."""

    calibration: str
    stage: str
    sensitivity_na_um: float
    off_on_average: Spread
    off_at_end: Spread


@dataclass(frozen=True)
class Converted(Answer):
    """Per sample (N,): seconds, nA, µM and its 90 % band; NaN where no number can be given.

    `account`: everything it rests on, as plain values, to be kept beside the result.
    """

    time_s: Floats
    current_na: Floats
    concentration_um: Floats
    low_um: Floats
    high_um: Floats
    sensitivity_start: Spread
    sensitivity_end: Spread
    fixed: tuple[FixedFactor, ...]
    account: dict[str, Any]
    warnings: tuple[str, ...]


@dataclass(frozen=True)
class Known:
    """The probe, its life, its comparable readings and the run; `start` is where the recording's time is zero."""

    assay: Assay
    probe: Row
    life: list[Event]
    calibrations: dict[int, Calibration]
    figures: dict[int, CalibrationFigures]
    cohort: Cohort
    run: Event
    start: datetime

    @property
    def readings(self) -> list[Event]:
        return self.cohort.readings[self.probe["electrode"], self.assay.waveform]

    @property
    def pre(self) -> Event | None:
        return next((event for event in reversed(self.readings) if event.at <= self.run.at), None)

    @property
    def post(self) -> Event | None:
        return next((event for event in self.readings if event.at >= lives.end_of(self.run)), None)

    @property
    def around(self) -> list[Event]:
        """Those before and after the run, as far as there are; else one made during it."""
        return [event for event in (self.pre, self.post) if event is not None] or self.readings[:1]


def converted(record: Record, wanted: Wanted) -> Converted:
    """Raises UnknownName; InputError for a recording or an exposure that can't be; DataError without a calibration."""
    time_s, current_na = _recording(wanted)
    known = _known(record, wanted)
    run_s = exposed.span_s(known.run, known.start, time_s)
    fit = fits.fit_for(record, known.assay)
    tried = None if wanted.background is None else trial(record, known.assay, fit)
    grid_s = _grid(time_s)
    log_s = _sharpened(_along(fit, known, grid_s), wanted.background, tried)
    read = curves.read_by(*_with_figures(known))
    step = np.round((time_s - grid_s[0]) / (grid_s[1] - grid_s[0])).astype(np.int64)
    low, middle, high = band(current_na, step, log_s, read.curve)
    fixed = tuple(_fixed(event, known, np.exp(log_s)) for event in known.around)
    warnings = (
        *remarks.of_recording(time_s, current_na, run_s),
        *remarks.of_range(current_na, middle, read),
        *read.said,
        *remarks.of_calibrations(known.life, known.run, known.pre, known.post, known.assay.waveform),
        *([] if tried is None else [tried.said]),
        *([] if fit.converged else ["the cohort's fit did not converge: look at `electrolog fit`"]),
    )
    account = _account(wanted, known, fit, read) | {
        "background_trial": None if tried is None else asdict(tried),
        "sensitivity": _by_minute(grid_s, log_s),
        "fixed_factors": [asdict(one) for one in fixed],
        "warnings": list(warnings),
    }
    start, end = _spread(np.exp(log_s[0])), _spread(np.exp(log_s[-1]))
    return Converted(time_s, current_na, _told(middle), _told(low), _told(high), start, end, fixed, account, warnings)


def _recording(wanted: Wanted) -> tuple[Floats, Floats]:
    time_s, current_na = wanted.trace or signal_files.trace_from(wanted.file, wanted.rate_hz)
    time_s = checked_clock(time_s)
    if len(current_na) != len(time_s) or not np.isfinite(current_na).any():
        raise InputError(f"{wanted.file.name}: {len(time_s)} times go with no current at all; each sample needs one")
    return time_s, current_na


def _told(concentration_um: Floats) -> Floats:
    return np.where(np.isfinite(concentration_um), concentration_um, np.nan)


def _known(record: Record, wanted: Wanted) -> Known:
    with record.reading() as connection:
        assay = fits.assay(connection, wanted.analyte, wanted.waveform)
        probe = queries.probes(connection, [wanted.probe])[0]
        found = queries.calibrations(connection, [probe["id"]], assay.analyte_id)
        life = queries.events(connection, [probe["id"]]).get(probe["electrode"], [])
    figures = made.all_figures(record, found)
    unit = (probe["electrode"], assay.waveform)
    cohort = gather([probe], {unit[0]: life}, figures, assay.analyte, [unit])
    if not cohort.readings[unit]:
        raise DataError(
            f"{unit[0]} has no calibration with {assay.said} that gives a sensitivity: a current can't become a number",
            "calibrate it with this analyte and waveform; after the run is better than never",
        )
    run = exposed.find(life, exposed.Asked(wanted.exposure, wanted.start, wanted.file.stem))
    calibrations = {one.row["id"]: one for one in found}
    return Known(assay, probe, life, calibrations, figures, cohort, run, wanted.start or run.at)


def _grid(time_s: Floats) -> Floats:
    """Every minute of the recording, or as many steps as are enough."""
    length_s = float(time_s[-1] - time_s[0])
    steps = min(MOST_STEPS, max(1, math.ceil(length_s / 60)))
    return np.linspace(time_s[0], time_s[-1], steps + 1)


def _along(fit: CohortFit, known: Known, grid_s: Floats) -> Floats:
    """(T, D) log sensitivity, given the probe's whole life, what came after the run too."""
    moments = [known.start + timedelta(seconds=second) for second in grid_s.tolist()]
    unit = (known.assay.analyte, known.assay.waveform)
    story = exposed.Story(known.probe, known.life, known.figures, known.readings)
    cut = exposed.cut_at(moments, story, unit, known.cohort.events)
    return log_sensitivity_along(posterior(fit, known.cohort.events), cut.events, cut.passed)


def _sharpened(log_s: Floats, background: Background | None, tried: Trial | None) -> Floats:
    """The draws that go with how the background changed, where this lab has found that it tells."""
    if background is None or tried is None or tried.law is None:
        return log_s
    return log_s[:, resampled(tried.law, log_s[-1] - log_s[0], background.log_change)]


def _with_figures(known: Known) -> tuple[list[Calibration], list[CalibrationFigures]]:
    ids = [event.row["id"] for event in known.around]
    return [known.calibrations[key] for key in ids], [known.figures[key] for key in ids]


def _fixed(event: Event, known: Known, sensitivity_na_um: Floats) -> FixedFactor:
    factor = known.figures[event.row["id"]].sensitivity_na_um or math.nan
    off = sensitivity_na_um / factor - 1
    return FixedFactor(
        event.row["calibration"], event.row["stage"], factor, _spread(off.mean(axis=0)), _spread(off[-1])
    )


def _spread(draws: Floats) -> Spread:
    low, median, high = np.quantile(draws, (0.05, 0.5, 0.95)).tolist()
    return Spread(median, low, high)


def _by_minute(grid_s: Floats, log_s: Floats) -> list[dict[str, float]]:
    low, median, high = np.exp(np.quantile(log_s, (0.05, 0.5, 0.95), axis=1)).tolist()
    return [
        {"time_s": second, "low_na_um": a, "median_na_um": b, "high_na_um": c}
        for second, a, b, c in zip(grid_s.tolist(), low, median, high, strict=True)
    ]


def _account(wanted: Wanted, known: Known, fit: CohortFit, read: curves.ReadBy) -> dict[str, Any]:
    run = known.run
    return {
        "file": wanted.file.name,
        "sha256": signal_files.fingerprint(wanted.file),
        "electrode": known.probe["electrode"],
        "analyte": known.assay.analyte,
        "waveform": known.assay.waveform,
        "exposure": {name: run.row[name] for name in ("id", "duration_min", "setting", "recording")},
        "exposure_start": iso_utc(run.at),
        "time_zero": iso_utc(known.start),
        "before": _calibration(known, known.pre),
        "after": _calibration(known, known.post),
        "curve": asdict(read.curve),
        "calibrated_to_um": read.highest_um,
        "band": 0.9,
        "background": None if wanted.background is None else asdict(wanted.background),
        "fit": {"method": fit.method, "fingerprint": fit.fingerprint, "converged": fit.converged},
        "electrolog": version("electrolog"),
    }


def _calibration(known: Known, event: Event | None) -> dict[str, Any] | None:
    if event is None:
        return None
    figures = known.figures[event.row["id"]]
    return {
        "calibration": event.row["calibration"],
        "at": iso_utc(event.at),
        "stage": event.row["stage"],
        "sensitivity_na_um": figures.sensitivity_na_um,
        "sensitivity_se_na_um": figures.sensitivity_se_na_um,
        "shape": figures.shape,
    }
