"""What speaks against a calibration beside its own points: its standard, its circumstances, its day, its fellows."""

from __future__ import annotations

import math
from collections import defaultdict
from collections.abc import Mapping, Sequence
from datetime import date
from typing import Any

from electrolog.answers import figures as made
from electrolog.answers import life as lives
from electrolog.measure.calibrate import CalibrationFigures
from electrolog.measure.detection import claimed_below_detection
from electrolog.measure.health import Circumstances, day_points_at_the_standard, unhealthy
from electrolog.measure.uneven import pooled_growth
from electrolog.record import queries, sheets
from electrolog.record.names import Names
from electrolog.record.queries import Calibration, Event
from electrolog.record.readable import Row
from electrolog.record.store import Record

Figures = Mapping[int, CalibrationFigures]
Said = dict[int, tuple[str, ...]]
Unit = tuple[str, str, str]  # probe, analyte, waveform
ByUnit = dict[Unit, list[Calibration]]
_MOST_DAYS = 400  # an engine limits the length of one statement


def warnings(
    record: Record, asked: Sequence[Calibration], numbers: Figures, expected_um: tuple[float, float] | None = None
) -> Said:
    """By calibration number; `asked` are all calibrations of their probes, oldest first."""
    if not asked:
        return {}
    fellows, lives_of_all, standards = _around(record, asked)
    figures = {**made.all_figures(record, fellows), **numbers}
    said: dict[int, list[str]] = defaultdict(list)
    among, of = _by_unit(asked), {one.row["id"]: _circumstances(one, standards) for one in asked}
    for one in asked:
        earlier = [of[other.row["id"]] for other in _earlier(one, among)]
        said[one.row["id"]] += unhealthy(of[one.row["id"]], earlier, expected_um=expected_um)
        said[one.row["id"]] += _unseen(expected_um, figures[one.row["id"]].lod_um)
    for key, text in _of_the_days(fellows, figures, lives_of_all):
        said[key].append(text)
    for key, text in _of_the_fellows(asked, fellows, figures):
        said[key].append(text)
    return {key: tuple(texts) for key, texts in said.items()}


def _unseen(expected_um: tuple[float, float] | None, lod_um: float | None) -> list[str]:
    text = claimed_below_detection(expected_um[0], lod_um, "the expected signal") if expected_um else None
    return [text] if text else []


def _around(
    record: Record, asked: Sequence[Calibration]
) -> tuple[list[Calibration], dict[str, list[Event]], dict[str, Row]]:
    """All that was measured on the same days with the same analytes, and the calibrations and lives of those probes."""
    days = sorted({one.at.date() for one in asked}, reverse=True)[:_MOST_DAYS]
    with record.reading() as connection:
        standards = queries.standards(connection, [one.row["standard"] for one in asked])
        names = Names(connection)
        fellows: list[Calibration] = []
        probes: dict[int, None] = {}
        for analyte_id in {names.row_id("analytes", one.row["analyte"]): None for one in asked}:
            ids = queries.calibrated_on(connection, days, analyte_id)
            fellows += queries.calibrations(connection, ids, analyte_id)
            probes.update(dict.fromkeys(ids))
        of = (sheets.EXPOSURES, *lives.RENEWING)
        return fellows, queries.events(connection, list(probes), of), standards


def _by_unit(among: Sequence[Calibration]) -> ByUnit:
    found: ByUnit = defaultdict(list)
    for one in among:
        found[_unit(one)].append(one)
    return found


def _unit(one: Calibration) -> Unit:
    return one.row["electrode"], one.row["analyte"], one.row["waveform"]


def _earlier(one: Calibration, among: ByUnit) -> list[Calibration]:
    """Of the same probe, analyte and waveform."""
    return [other for other in among[_unit(one)] if other.at < one.at]


def _circumstances(one: Calibration, standards: Mapping[str, Row]) -> Circumstances:
    row = one.row
    standard = standards.get(row["standard"] or "", {})
    above = [concentration for concentration, _ in one.points if concentration > 0]
    return Circumstances(
        at=one.at,
        analyte=row["analyte"],
        medium=row["medium"],
        temperature_c=row["temperature_c"],
        noise_na=row["noise_na"],
        background_na=row["background_na"],
        oxidation_peak_v=row["oxidation_peak_v"],
        reduction_peak_v=row["reduction_peak_v"],
        highest_um=max(above, default=None),
        lowest_um=min(above, default=None),
        standard_prepared_at=standard.get("prepared_at"),
        standard_expires_at=standard.get("expires_at"),
        diluent=standard.get("diluent"),
        standard_analyte=standard.get("analyte"),
    )


def _of_the_days(
    fellows: Sequence[Calibration], figures: Figures, life: Mapping[str, Sequence[Event]]
) -> list[tuple[int, str]]:
    """Where all probes measured with one standard, or on one rig, moved alike though nothing was done to them."""
    groups: dict[tuple[date, str, str, str], list[tuple[int, float]]] = defaultdict(list)
    among = _by_unit(fellows)
    for one in fellows:
        shift = _untouched_shift(one, among, figures, life.get(one.row["electrode"], []))
        for what in ("standard", "rig"):
            if shift is not None and one.row[what]:
                shared = (one.at.date(), one.row["analyte"], one.row["waveform"], f"{what} {one.row[what]}")
                groups[shared].append((one.row["id"], shift))
    return [(key, text) for members, what in _told_apart(groups) for key, text in _said_of(members, what)]


def _told_apart(groups: Mapping[Any, list[tuple[int, float]]]) -> list[tuple[list[tuple[int, float]], str]]:
    """Where the same probes share both a standard and a rig, the two can't be told apart: they are named together."""
    named: dict[tuple[int, ...], tuple[list[tuple[int, float]], list[str]]] = {}
    for (*_, what), members in groups.items():
        named.setdefault(tuple(key for key, _ in members), (members, []))[1].append(what)
    return [(members, " or ".join(whats)) for members, whats in named.values()]


def _said_of(members: Sequence[tuple[int, float]], what: str) -> list[tuple[int, str]]:
    text = day_points_at_the_standard([shift for _, shift in members], what)
    return [(key, text) for key, _ in members] if text else []


def _untouched_shift(one: Calibration, among: ByUnit, figures: Figures, life: Sequence[Event]) -> float | None:
    """log of the sensitivity over the one before, where the probe lay untouched in between: it should be the same."""
    before = next(reversed(_earlier(one, among)), None)
    if before is None or any(before.at <= event.at <= one.at for event in life):
        return None
    now, then = figures[one.row["id"]].sensitivity_na_um, figures[before.row["id"]].sensitivity_na_um
    return math.log(now / then) if now and then and now > 0 and then > 0 else None


def _of_the_fellows(
    asked: Sequence[Calibration], fellows: Sequence[Calibration], figures: Figures
) -> list[tuple[int, str]]:
    """Said of the newest calibration: single points can't show by themselves that they scatter more higher up."""
    newest = asked[-1]
    own = figures[newest.row["id"]]
    if own.shape != "line" or own.weighting or own.interval_route or own.sensitivity_low_na_um is None:
        return []
    alike = [one for one in fellows if all(one.row[k] == newest.row[k] for k in ("analyte", "waveform"))]
    growth = pooled_growth(_points(one) for one in alike if figures[one.row["id"]].shape == "line")
    if growth is None:
        return []
    text = (
        f"in {growth.lines} calibrations at hand the upper concentrations scatter {growth.times:.2g} times more than "
        "the lower: this 95 % interval is too narrow; weights of 1/x2 fit such points"
    )
    return [(newest.row["id"], text)]


def _points(one: Calibration) -> tuple[Sequence[float], Sequence[float]]:
    concentrations, currents = zip(*one.points, strict=True)
    return concentrations, currents
