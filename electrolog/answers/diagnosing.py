"""Why did this probe get worse? Its last two comparable calibrations, and all that the record knows around them."""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace
from datetime import datetime, timedelta

import numpy as np

from electrolog.answers import fits
from electrolog.answers import life as lives
from electrolog.answers.answer import Answer
from electrolog.answers.asked import Floats
from electrolog.answers.cohorts import Cohort, gather, unusable
from electrolog.answers.figures import all_figures
from electrolog.answers.fits import Assay
from electrolog.answers.history import usual_waveform
from electrolog.answers.labels import known_labels
from electrolog.clock import utc_now
from electrolog.errors import DataError
from electrolog.fouling.events import READING, Events
from electrolog.fouling.fit import CohortFit
from electrolog.fouling.forecast import posterior
from electrolog.judge.diagnosis import Diagnosis, Symptoms, diagnose
from electrolog.measure.calibrate import CalibrationFigures
from electrolog.record import queries, sheets
from electrolog.record.queries import Event
from electrolog.record.readable import Row
from electrolog.record.store import Record

Figures = Mapping[int, CalibrationFigures]


@dataclass(frozen=True)
class Diagnosed(Answer):
    """before and after: the calibrations compared, by label. symptoms: what was found; None in it: not measured."""

    electrode: str
    analyte: str
    waveform: str
    before: str
    before_at: datetime
    after: str
    after_at: datetime
    sensitivity_before_na_um: float
    sensitivity_after_na_um: float
    symptoms: Symptoms
    diagnosis: Diagnosis
    notes: tuple[str, ...]


@dataclass(frozen=True)
class _Pair:
    """One probe's calibration and the one before it."""

    electrode: str
    before: Event
    after: Event


@dataclass(frozen=True)
class _Lab:
    assay: Assay
    probes: dict[str, Row]
    life: dict[str, list[Event]]
    figures: Figures

    def comparable(self, electrode: str) -> list[Event]:
        found = lives.comparable_calibrations(self.life.get(electrode, []), self.assay.analyte, self.assay.waveform)
        return [event for event in found if not unusable(self.figures[event.row["id"]])]

    def log_change(self, pair: _Pair) -> float:
        return self.log_sensitivity(pair.after) - self.log_sensitivity(pair.before)

    def log_sensitivity(self, event: Event) -> float:
        return math.log(self.figures[event.row["id"]].sensitivity_na_um or math.nan)


def diagnosed(
    record: Record,
    typed: str,
    analyte: str,
    waveform: str | None = None,
    *,
    first: bool = False,
    moment: datetime | None = None,
) -> Diagnosed:
    """The last calibration against the one before it, or (`first`) against the first.

    waveform: None for the one it was last calibrated with.
    Raises UnknownName, InputError, and DataError where there are no two to compare.
    """
    moment = moment or utc_now()
    with record.reading() as connection:
        label = known_labels(connection, [typed])[0]
    waveform = waveform or usual_waveform(record, label, analyte)
    with record.reading() as connection:
        assay = fits.assay(connection, analyte, waveform)
        probes = {probe["electrode"]: probe for probe in queries.probes(connection)}
        told = queries.events(connection)
        found = queries.calibrations(connection)
    life = {name: lives.until(events, moment) for name, events in told.items()}
    lab = _Lab(assay, probes, life, all_figures(record, found))
    own = lab.comparable(label)
    if len(own) < 2:
        raise DataError(
            f"{label} has {len(own)} usable calibrations with {assay.said}; two are needed to see a change",
            "calibrate it again, or ask for another analyte or waveform",
        )
    fit = fits.fit_for(record, assay)
    pair = _Pair(label, own[0] if first else own[-2], own[-1])
    symptoms = _symptoms(lab, pair, fit)
    return Diagnosed(
        label,
        assay.analyte,
        assay.waveform,
        pair.before.row["calibration"],
        pair.before.at,
        pair.after.row["calibration"],
        pair.after.at,
        math.exp(lab.log_sensitivity(pair.before)),
        math.exp(lab.log_sensitivity(pair.after)),
        symptoms,
        diagnose(symptoms),
        _notes(lab, pair, symptoms),
    )


def _symptoms(lab: _Lab, pair: _Pair, fit: CohortFit) -> Symptoms:
    reading_sd = math.sqrt(2) * fits.reading_sd_log(fit)
    expected = _expected(lab, [pair], fit)
    others = _others(lab, pair, fit)
    before, after = pair.before.row, pair.after.row
    oxidation, reduction = (_difference(before[name], after[name]) for name in ("oxidation_peak_v", "reduction_peak_v"))
    since = [event for event in lab.life[pair.electrode] if pair.before.at < event.at <= pair.after.at]
    return Symptoms(
        log_change=lab.log_change(pair),
        log_change_sd=reading_sd,
        exposure_h=sum(_exposed_h(lab.life[pair.electrode], pair)),
        expected_log_change=expected[0][0] if expected else None,
        expected_sd=expected[0][1] if expected else None,
        others_log_surprise=others[0] if others else None,
        others_sd=others[1] if others else None,
        others_count=others[2] if others else 0,
        oxidation_shift_v=oxidation,
        reduction_shift_v=reduction,
        log_background=_log_ratio(before["background_na"], after["background_na"]),
        log_exposed_length=_log_length(lab, pair),
        log_noise=_log_ratio(before["noise_na"], after["noise_na"]),
        seal_ok=_seal(since),
        coated=bool(lives.of(lab.life[pair.electrode], sheets.COATINGS)),
        log_selectivity=_log_selectivity(lab, pair),
    )


def _exposed_h(life: Sequence[Event], pair: _Pair) -> list[float]:
    hours = (lives.exposure_h(life, at) for at in (pair.before.at, pair.after.at))
    before, after = (sum(found.values()) for found in hours)
    return [after - before]


def _difference(before: float | None, after: float | None) -> float | None:
    return None if before is None or after is None else after - before


def _log_ratio(before: float | None, after: float | None) -> float | None:
    return math.log(after / before) if before and after and after / before > 0 else None


def _log_length(lab: _Lab, pair: _Pair) -> float | None:
    """From the lengths known before each of the two; None unless one was measured in between."""
    lengths: list[tuple[datetime, float]] = []
    for event in lab.life[pair.electrode]:
        length = event.row.get("exposed_length_um") if event.sheet in (sheets.INSPECTIONS, sheets.RECUTS) else None
        if length and event.at <= pair.after.at:
            lengths.append((event.at, length))
    earlier = [length for at, length in lengths if at <= pair.before.at]
    between = [length for at, length in lengths if at > pair.before.at]
    start = earlier[-1] if earlier else lab.probes[pair.electrode]["exposed_length_um"]
    return math.log(between[-1] / start) if between and start else None


def _seal(since: Sequence[Event]) -> bool | None:
    said = [event.row["seal_ok"] for event in lives.of(since, sheets.INSPECTIONS) if event.row["seal_ok"]]
    return said[-1] == "yes" if said else None


def _log_selectivity(lab: _Lab, pair: _Pair) -> float | None:
    """Change of the ratio to another analyte measured on the same days; of several, the one whose ratio moved most."""
    found = []
    for analyte in {event.row["analyte"] for event in lives.of(lab.life[pair.electrode], sheets.CALIBRATIONS)}:
        if analyte == lab.assay.analyte:
            continue
        ratios = [_ratio_to(lab, pair.electrode, event, analyte) for event in (pair.before, pair.after)]
        if None not in ratios:
            found.append(float(ratios[1] or 0.0) - float(ratios[0] or 0.0))
    return max(found, key=abs, default=None)


def _ratio_to(lab: _Lab, electrode: str, event: Event, analyte: str) -> float | None:
    same_day = [
        other
        for other in lives.comparable_calibrations(lab.life[electrode], analyte, lab.assay.waveform)
        if other.at.date() == event.at.date() and not unusable(lab.figures[other.row["id"]])
    ]
    return lab.log_sensitivity(event) - lab.log_sensitivity(same_day[-1]) if same_day else None


def _others(lab: _Lab, pair: _Pair, fit: CohortFit) -> tuple[float, float, int] | None:
    """Mean surprise of the other probes measured with the same standard that day, its standard error, and how many."""
    pairs = []
    for electrode in lab.probes:
        if electrode == pair.electrode:
            continue
        own = lab.comparable(electrode)
        here = [place for place, event in enumerate(own) if place and _same_day(event, pair.after)]
        if here:
            pairs.append(_Pair(electrode, own[here[-1] - 1], own[here[-1]]))
    expected = _expected(lab, pairs, fit)
    if not expected:
        return None
    surprises = np.array([lab.log_change(one) - mean for one, (mean, _) in zip(pairs, expected, strict=True)])
    sds = np.hypot([sd for _, sd in expected], math.sqrt(2) * fits.reading_sd_log(fit))
    # The median: one probe of the day that broke must not make the standard look bad.
    return float(np.median(surprises)), float(sds.mean() / math.sqrt(len(pairs))), len(pairs)


def _same_day(event: Event, other: Event) -> bool:
    return event.at.date() == other.at.date() and event.row["standard"] == other.row["standard"]


def _expected(lab: _Lab, pairs: Sequence[_Pair], fit: CohortFit) -> list[tuple[float, float]]:
    """Mean and deviation of the log change that the forecast made of what lay between, without the last reading."""
    if not pairs:
        return []
    cohort = _until(lab, pairs)
    later = posterior(fit, _without_last_reading(cohort.events))
    none = np.zeros((len(pairs), len(cohort.events.settings)))
    counts = np.bincount(cohort.events.unit[cohort.events.kind == READING], minlength=len(pairs)) - 1
    which = np.array([_place(cohort, lab, pair) for pair in pairs], dtype=np.int64)
    change: Floats = later.log_sensitivity(none) - later.log_sensitivity_at_reading(np.minimum(which, counts - 1))
    return [(float(mean), float(sd)) for mean, sd in zip(change.mean(axis=1), change.std(axis=1), strict=True)]


def _until(lab: _Lab, pairs: Sequence[_Pair]) -> Cohort:
    """Each probe's life up to its later calibration; after it nothing has happened yet."""
    life = {pair.electrode: lives.until(lab.life[pair.electrode], pair.after.at) for pair in pairs}
    cut = {name: _cut_off(events, pair.after.at) for (name, events), pair in zip(life.items(), pairs, strict=True)}
    units = [(pair.electrode, lab.assay.waveform) for pair in pairs]
    return gather([lab.probes[name] for name in cut], cut, lab.figures, lab.assay.analyte, units)


def _cut_off(life: Sequence[Event], end: datetime) -> list[Event]:
    """Without what remains of a run that was under way."""
    return [_shortened(event, end) if event.sheet is sheets.EXPOSURES else event for event in life]


def _shortened(exposure: Event, end: datetime) -> Event:
    minutes = min(exposure.row["duration_min"], (end - exposure.at) / timedelta(minutes=1))
    return replace(exposure, row={**exposure.row, "duration_min": minutes})


def _place(cohort: Cohort, lab: _Lab, pair: _Pair) -> int:
    numbers = [event.row["id"] for event in cohort.readings[pair.electrode, lab.assay.waveform]]
    return numbers.index(pair.before.row["id"])


def _without_last_reading(events: Events) -> Events:
    read = np.flatnonzero(events.kind == READING)
    last = read[np.searchsorted(events.unit[read], np.arange(len(events.units)), side="right") - 1]
    kept = np.ones(len(events.unit), dtype=bool)
    kept[last] = False
    columns = {name: getattr(events, name)[kept] for name in ("unit", "kind", "which", "amount", "se")}
    return replace(events, **columns)


def _notes(lab: _Lab, pair: _Pair, symptoms: Symptoms) -> tuple[str, ...]:
    """A cleaning before the second calibration hides the loss that it was to measure."""
    said = []
    between = [event for event in lab.life[pair.electrode] if pair.before.at < event.at <= pair.after.at]
    for event in between:
        if event.sheet in lives.RENEWING:
            said.append(f"{event.name} lies between the two: it hides part of the loss")
    missing = {
        "peak potentials": symptoms.oxidation_shift_v is None or symptoms.reduction_shift_v is None,
        "background": symptoms.log_background is None,
        "noise": symptoms.log_noise is None,
        "another analyte on the same days": symptoms.log_selectivity is None,
        "an inspection of the seal": symptoms.seal_ok is None,
        "other probes on that day's standard": symptoms.others_log_surprise is None,
    }
    unknown = [name for name, gone in missing.items() if gone]
    return (*said, f"not known, and it would tell more: {', '.join(unknown)}") if unknown else tuple(said)
