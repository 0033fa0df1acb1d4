"""What a paper's methods section and its supplementary table say of the probes: numbers, never advice."""

from __future__ import annotations

import math
import statistics
from collections import Counter
from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from datetime import datetime
from typing import Any

from electrolog.answers import life as lives
from electrolog.answers.answer import Answer
from electrolog.answers.history import Reading, readings
from electrolog.answers.labels import known_labels
from electrolog.clock import utc_now
from electrolog.errors import InputError
from electrolog.record import queries, sheets
from electrolog.record.books.drafts import TIME_ASSUMED
from electrolog.record.queries import Event
from electrolog.record.readable import Row, rows
from electrolog.record.store import Record
from electrolog.record.struck import struck_calibrations


@dataclass(frozen=True)
class Spread:
    """Over `n` values; the standard deviation of one value alone is unknown."""

    n: int
    mean: float
    sd: float | None
    least: float
    most: float


@dataclass(frozen=True)
class Described(Answer):
    """`counts`: how many probes (or calibrations) each word holds for; '' where the record doesn't say."""

    analyte: str
    waveforms: tuple[Row, ...]
    probes: tuple[str, ...]
    batches: int
    length_um: Spread | None
    diameter_um: Spread | None
    fibres: dict[str, int]
    insulations: dict[str, int]
    coatings: dict[str, int]
    media: dict[str, int]
    temperature_c: Spread | None
    stages: dict[str, int]
    points: Spread | None
    sensitivity_na_um: dict[str, Spread]  # by stage
    lod_um: Spread | None
    share_left: Spread | None  # at post-calibrations
    hours_to_run: Spread | None  # from the newest pre-calibration to the run
    hours_from_run: Spread | None  # from the run's end to the next post-calibration
    untimed_runs: int  # of which only the day is known, so that neither is
    runs: Spread | None  # duration in min
    settings: dict[str, int]
    without_points: int
    uncalibrated: int  # named probes without a calibration for the analyte
    retired: dict[str, int]
    struck: dict[str, str]  # calibrations left out, with the reason given
    computed_by: tuple[str, ...]  # method versions of the figures
    table: tuple[dict[str, Any], ...]  # the supplementary table: one row for each calibration


def methods(record: Record, labels: Sequence[str], analyte: str, waveform: str | None = None) -> Described:
    """All that the record says of the probes calibrated for an analyte; of every one where none is named.

    Raises UnknownName, and InputError where no calibration is found.
    """
    named = _named(record, labels)
    found = readings(record, named, analyte, waveform)
    if not found:
        raise InputError("no calibration of these probes for this analyte; accepted: probes that have one")
    used = list(dict.fromkeys(one.electrode for one in found))
    with record.reading() as connection:
        probes = queries.probes(connection, used)
        life = queries.events(connection, [probe["id"] for probe in probes])
        waves = {str(row["waveform"]): row for row in rows(connection, sheets.WAVEFORMS)}
        struck = struck_calibrations(connection, [probe["id"] for probe in probes])
    events = [event for probe in probes for event in life.get(probe["electrode"], [])]
    coated = {str(probe["electrode"]): _coating(life.get(probe["electrode"], [])) for probe in probes}
    runs = [event for event in events if event.sheet is sheets.EXPOSURES]
    return Described(
        analyte=found[0].analyte,
        waveforms=tuple(waves[name] for name in dict.fromkeys(one.waveform for one in found)),
        probes=tuple(used),
        **_made(probes),
        coatings=counted(coated.values()),
        media=counted(one.row["medium"] for one in found),
        temperature_c=spread(one.row["temperature_c"] for one in found),
        stages=counted(one.stage for one in found),
        points=spread(float(len(one.points)) for one in found if one.points),
        sensitivity_na_um={
            stage: said
            for stage in ("pre", "interim", "post")
            if (said := spread(one.figures.sensitivity_na_um for one in found if one.stage == stage)) is not None
        },
        lod_um=spread(one.figures.lod_um for one in found),
        share_left=spread(one.share_left for one in found if one.stage == "post"),
        **_timed(found, runs),
        runs=spread(event.row["duration_min"] for event in runs),
        settings=counted(event.row["setting"] for event in runs),
        without_points=sum(not one.points for one in found),
        uncalibrated=len(named) - len(used),
        retired=counted(event.row["reason"] for event in events if event.sheet is sheets.RETIREMENTS),
        struck=dict(struck),
        computed_by=tuple(sorted({one.figures.method for one in found})),
        table=_table(found, coated, probes),
    )


def _made(probes: Sequence[Row]) -> dict[str, Any]:
    return {
        "batches": len({probe["batch"] for probe in probes if probe["batch"]}),
        "length_um": spread(probe["exposed_length_um"] for probe in probes),
        "diameter_um": spread(probe["diameter_um"] or probe["fibre_diameter_um"] for probe in probes),
        "fibres": counted(probe["fibre"] for probe in probes),
        "insulations": counted(probe["insulation"] for probe in probes),
    }


def spread(values: Iterable[float | None]) -> Spread | None:
    known = [float(value) for value in values if value is not None and math.isfinite(value)]
    if not known:
        return None
    sd = statistics.stdev(known) if len(known) > 1 else None
    return Spread(len(known), statistics.fmean(known), sd, min(known), max(known))


def counted(words: Iterable[str | None]) -> dict[str, int]:
    return dict(Counter(word or "" for word in words).most_common())


def _coating(life: Sequence[Event]) -> str:
    films = [str(event.row["material"]) for event in life if event.sheet is sheets.COATINGS]
    return " then ".join(dict.fromkeys(films)) or "none"


def _timed(found: Sequence[Reading], runs: Sequence[Event]) -> dict[str, Any]:
    """How long before and after its run a probe was calibrated; a time of day that was assumed tells neither."""
    known = [one for one in found if TIME_ASSUMED not in (one.row["note"] or "")]
    timed = [run for run in runs if TIME_ASSUMED not in (run.row["note"] or "")]
    before, after = [], []
    for run in timed:
        own = [one for one in known if one.electrode == run.row["electrode"]]
        pre = [one.at for one in own if one.stage == "pre" and one.at <= run.at]
        later = [one.at for one in runs if one.row["electrode"] == run.row["electrode"] and one.at > run.at]
        until = min(later, default=utc_now())  # a calibration behind the next run is the next run's
        post = [one.at for one in own if one.stage == "post" and lives.end_of(run) <= one.at <= until]
        before += [_hours(max(pre), run.at)] if pre else []
        after += [_hours(lives.end_of(run), min(post))] if post else []
    told = {"hours_to_run": spread(before), "hours_from_run": spread(after)}
    return {**told, "untimed_runs": len(runs) - len(timed)}


def _hours(start: datetime, end: datetime) -> float:
    return (end - start).total_seconds() / 3600


def _table(found: Sequence[Reading], coated: dict[str, str], probes: Sequence[Row]) -> tuple[dict[str, Any], ...]:
    lengths = {str(probe["electrode"]): probe["exposed_length_um"] for probe in probes}
    return tuple(_table_row(one, coated, lengths) for one in found)


def _table_row(one: Reading, coated: dict[str, str], lengths: dict[str, float | None]) -> dict[str, Any]:
    figures = one.figures
    return {
        "electrode": one.electrode,
        "exposed_length_um": lengths[one.electrode],
        "coating": coated[one.electrode],
        "calibration": one.calibration,
        "at": one.at,
        "stage": one.stage,
        "waveform": one.waveform,
        "medium": one.row["medium"],
        "temperature_c": one.row["temperature_c"],
        "standard": one.row["standard"],
        "exposure_before_h": sum(one.exposure_h.values()),
        "n_points": figures.n_points,
        "sensitivity_na_um": figures.sensitivity_na_um,
        "sensitivity_se_na_um": figures.sensitivity_se_na_um,
        "intercept_na": figures.intercept_na,
        "r_squared": figures.r_squared,
        "lod_um": figures.lod_um,
        "fraction_left": one.share_left,
    }


def _named(record: Record, labels: Sequence[str]) -> list[str]:
    with record.reading() as connection:
        if labels:
            return known_labels(connection, labels)
        return [str(row["electrode"]) for row in rows(connection, sheets.ELECTRODES)]
