"""A probe's papers: what it is, its calibrations, the factor in force, the verdict, and what all of it rests on."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import asdict, dataclass
from datetime import datetime, timedelta
from typing import Any

from electrolog.answers import figures as made
from electrolog.answers import life as lives
from electrolog.answers.asked import Run
from electrolog.answers.carbon import carbon_at
from electrolog.answers.checking import Checked, Demands, check, limits_in_force
from electrolog.answers.fits import Assay, assay
from electrolog.answers.recordings.factor import Factor, factor_at
from electrolog.answers.recordings.tables import Meaning, Table, meanings_of, number, table
from electrolog.answers.report import origin
from electrolog.clock import shown_moment
from electrolog.errors import DataError
from electrolog.judge.limits import Limits
from electrolog.judge.verdict import NowAndEnd
from electrolog.measure.calibrate import CalibrationFigures
from electrolog.record import queries, sheets
from electrolog.record.queries import Calibration, Event
from electrolog.record.readable import Row
from electrolog.record.store import Record

JUST_BEFORE = timedelta(seconds=1)  # the run itself is not to count among what was known when it began


@dataclass(frozen=True)
class Occasion:
    """One recording: which probe, what was detected, from when; `setting` and `run_min` are needed for a verdict."""

    label: str
    analyte: str
    waveform: str
    start: datetime
    setting: str | None = None
    run_min: float | None = None
    needs_um: float | None = None
    file: str = ""
    sha256: str = ""


@dataclass(frozen=True)
class Papers:
    """`said`: what is missing, and why."""

    label: str
    description: str
    tables: tuple[Table, ...]
    factor: Factor | None
    verdict: Checked | None
    said: tuple[str, ...]


@dataclass(frozen=True)
class _Known:
    assay: Assay
    probe: Row
    life: list[Event]
    calibrations: list[Calibration]
    figures: dict[int, CalibrationFigures]
    limits: Limits

    def until(self, moment: datetime) -> list[Event]:
        return lives.until(self.life, moment)


@dataclass(frozen=True)
class _OfAssay:
    assay: Assay


def papers(record: Record, occasion: Occasion) -> Papers:
    """As known to the record now; factor and verdict as they stood just before the recording began.

    Raises UnknownName for a name that the record doesn't know.
    """
    moment = occasion.start - JUST_BEFORE
    known = _known(record, occasion)
    pair = (known.assay.analyte, known.assay.waveform)
    factor = factor_at(moment, known.life, known.figures, pair, known.limits)
    verdict, no_verdict = _verdict(record, occasion, moment)
    said = list(no_verdict)
    if factor is None:
        said.append(f"no factor: it had no calibration with {known.assay.said} when the recording began")
    carbon = carbon_at(known.probe, known.life, moment)
    electrode = {**known.probe, **asdict(carbon), **_exposed(known, moment), "coatings": _coatings(known, moment)}
    found = [
        table("electrode", "the probe, as it was when the recording began", ELECTRODE, [electrode]),
        table("calibrations", "every calibration of the probe", CALIBRATION, _calibrations(known)),
        table("calibration_points", "their raw points", POINT, _points(known)),
        table("factor", "the factor in force when the recording began", FACTOR, _factor(factor)),
        table("verdict", "the verdict on the probe for this run", VERDICT, _verdicts(verdict, occasion, moment)),
        table("reasons", "why the verdict is as it is", REASON, _reasons(verdict)),
        table("origin", "where all of this comes from", ORIGIN, [_origin(record, occasion)]),
    ]
    tables = tuple(one for one in found if len(one))
    return Papers(occasion.label, described(electrode), tables, factor, verdict, tuple(said))


def _known(record: Record, occasion: Occasion) -> _Known:
    with record.reading() as connection:
        chosen = assay(connection, occasion.analyte, occasion.waveform)
        probe = queries.probes(connection, [occasion.label])[0]
        life = queries.events(connection, [probe["id"]]).get(occasion.label, [])
        calibrations = queries.calibrations(connection, [probe["id"]])
        limits = limits_in_force(queries.limits(connection), _OfAssay(chosen), Demands())
    return _Known(chosen, probe, life, calibrations, made.all_figures(record, calibrations), limits)


def _verdict(record: Record, occasion: Occasion, moment: datetime) -> tuple[Checked | None, list[str]]:
    if occasion.setting is None or not occasion.run_min:
        return None, ["no verdict: where the probe was isn't known; log the run first, or give --setting"]
    run = Run(occasion.analyte, occasion.waveform, occasion.setting, occasion.run_min)
    try:
        return check(record, [occasion.label], run, Demands(occasion.needs_um), moment)[0], []
    except DataError as why:
        return None, [f"no verdict: {why.message}"]


# --- the tables' columns and rows -------------------------------------------------------------------------


ELECTRODE = {
    **meanings_of(sheets.ELECTRODES, "electrode", "batch", "geometry", "exposed_length_um", "diameter_um"),
    **meanings_of(sheets.BATCHES, "made_on", "made_by", "fibre", "fibre_diameter_um", "insulation", "seal"),
    "coatings": Meaning("films put on the carbon, with when"),
    "exposed_h": number("time in tissue and flow before this recording, in h"),
    "uses": number("runs before this recording"),
}
CALIBRATION = {
    **meanings_of(sheets.CALIBRATIONS, "calibration", "at", "stage", "analyte", "waveform", "medium", "temperature_c"),
    **meanings_of(sheets.CALIBRATIONS, "standard", "rig", "by", "noise_na", "background_na"),
    "sensitivity_na_um": number("sensitivity, in nA/µM"),
    "sensitivity_se_na_um": number("its standard error by the scatter of the points alone, in nA/µM"),
    "sensitivity_low_na_um": number("low end of its 95 % interval, in nA/µM"),
    "sensitivity_high_na_um": number("high end of its 95 % interval, in nA/µM"),
    "intercept_na": number("current at zero concentration, in nA"),
    "r_squared": number("share of the currents' variance that the line explains"),
    "n_points": number("how many points, replicates included"),
    "lod_um": number("detection limit, in µM"),
    "loq_um": number("quantification limit, in µM"),
    "linear_to_um": number("straight up to, in µM"),
    "shape": Meaning("line, line-through-zero or saturating"),
}
POINT = meanings_of(sheets.POINTS, "calibration", "concentration_um", "current_na")
FACTOR = {
    **meanings_of(sheets.CALIBRATIONS, "calibration", "at", "analyte", "waveform"),
    "sensitivity_na_um": number("the factor: current over concentration, in nA/µM"),
    "sensitivity_se_na_um": number("its standard error by the scatter of the points alone, in nA/µM"),
    "low_na_um": number("low end of its 95 % interval, the standard's own uncertainty included, in nA/µM"),
    "high_na_um": number("high end of its 95 % interval, the standard's own uncertainty included, in nA/µM"),
    "in_force": Meaning("yes, no, or unknown where the lab has set no limit to its age"),
    "age_h": number("its age when the recording began, in h"),
    "oldest_allowed_h": number("the lab's limit to its age, in h"),
    "valid_until": Meaning("when that limit is reached; empty where there is none or something has voided it"),
    "void_because": Meaning("what has happened since that the factor can't know of"),
}
_SPANS = {
    "sensitivity_na_um": ("true sensitivity", ", in nA/µM"),
    "fraction_left": ("share left of the reference calibration's sensitivity", ""),
    "lod_um": ("detection limit", ", in µM"),
}
_QUANTILES = {"low": "5 % quantile", "median": "median", "high": "95 % quantile"}
VERDICT = {
    "verdict": Meaning("fit, recalibrate, retire or undetermined"),
    "p_breach": number("odds that a limit of the lab's is broken by the end of the run"),
    "longest_run_min": number("longest run that stays fit, in min"),
    "analyte": Meaning("what was to be detected"),
    "waveform": Meaning("waveform applied"),
    "setting": Meaning("where the probe was"),
    "run_min": number("how long, in min"),
    "needs_um": number("the smallest signal that was to be seen, in µM"),
    "as_of": Meaning("the moment for which it was asked"),
    "notes": Meaning("what else there is to say"),
    **{
        f"{name}_{when}_{part}": number(f"{what} at the run's {when}: {quantile}{unit}")
        for name, (what, unit) in _SPANS.items()
        for when in ("start", "end")
        for part, quantile in _QUANTILES.items()
    },
}
REASON = {"rule": Meaning("which limit or rule"), "text": Meaning("the reason")}
ORIGIN = {
    "program": Meaning("what wrote this"),
    "made_at": Meaning("when"),
    "made_by": Meaning("by whom"),
    "journal_entries": number("state of the record: how many journal entries"),
    "journal_head": Meaning("state of the record: hash of the newest entry"),
    "methods": Meaning("by which methods figures were made"),
    "recording": Meaning("the recording's file"),
    "recording_sha256": Meaning("its SHA-256, before anything was put in"),
}


def _exposed(known: _Known, moment: datetime) -> dict[str, float]:
    state = lives.state(known.life, moment)
    return {"exposed_h": sum(state.exposure_h.values()), "uses": float(state.uses)}


def _coatings(known: _Known, moment: datetime) -> str:
    films = lives.of(known.until(moment), sheets.COATINGS)
    return "; ".join(
        " ".join(filter(None, (film.row["material"], film.row["method"], shown_moment(film.at)))) for film in films
    )


def _calibrations(known: _Known) -> list[dict[str, Any]]:
    return [{**one.row, **known.figures[one.row["id"]].to_dict()} for one in known.calibrations]


def _points(known: _Known) -> list[dict[str, Any]]:
    return [
        {"calibration": one.row["calibration"], "concentration_um": concentration, "current_na": current}
        for one in known.calibrations
        for concentration, current in one.points
    ]


def _factor(found: Factor | None) -> list[dict[str, Any]]:
    if found is None:
        return []
    force = {True: "yes", False: "no", None: "unknown"}[found.in_force]
    said = "; ".join(found.void_because)
    return [{**vars(found), "valid_until": found.valid_until, "in_force": force, "void_because": said}]


def _verdicts(found: Checked | None, occasion: Occasion, moment: datetime) -> list[dict[str, Any]]:
    if found is None:
        return []
    verdict = found.verdict
    row = {**vars(occasion), "as_of": moment, "notes": "; ".join(found.notes)}
    row |= {name: getattr(verdict, name) for name in ("verdict", "p_breach", "longest_run_min")}
    for name in _SPANS:
        row |= _quantiles(name, getattr(verdict, name))
    return [row]


def _quantiles(name: str, spans: NowAndEnd) -> Mapping[str, float]:
    both = (("start", spans.now), ("end", spans.end))
    return {
        f"{name}_{when}_{part}": value
        for when, spread in both
        if spread is not None
        for part, value in zip(_QUANTILES, spread, strict=True)
    }


def _reasons(found: Checked | None) -> Sequence[Mapping[str, Any]]:
    return [] if found is None else [asdict(reason) for reason in found.verdict.reasons]


def _origin(record: Record, occasion: Occasion) -> dict[str, Any]:
    found = origin(record)
    return {
        "program": f"electrolog {found.version}",
        "made_at": found.made_at,
        "made_by": found.made_by,
        "journal_entries": found.entries,
        "journal_head": found.head,
        "methods": "; ".join(f"{what}: {method}" for what, method in found.methods.items()),
        "recording": occasion.file,
        "recording_sha256": occasion.sha256,
    }


def described(electrode: Mapping[str, Any]) -> str:
    """One sentence, for where a format has room for no table."""
    parts = [f"carbon-fibre microelectrode {electrode['electrode']}"]
    for name, said in (
        ("batch", "batch {}"),
        ("fibre", "fibre: {}"),
        ("exposed_length_um", "{:g} µm exposed"),
        ("diameter_um", "{:g} µm across"),
        ("coatings", "coated: {}"),
        ("made_on", "made on {}"),
        ("made_by", "made by {}"),
    ):
        if electrode[name]:
            parts.append(said.format(electrode[name]))
    return ", ".join(parts)
