"""A calibration said back in full, and the list of exchange.md's keys."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import fields
from typing import Any

from electrolog.answers.detecting import Routes
from electrolog.answers.history import Reading
from electrolog.clock import shown_moment
from electrolog.measure.calibrate import CalibrationFigures
from electrolog.measure.geometry import Specific
from electrolog.show.history import none_said, share
from electrolog.show.machine import plain, print_csv, print_json
from electrolog.show.tables import print_lines, with_error
from electrolog.show.text import one_line
from electrolog.units import counted, shown_concentration, shown_span

_FIGURES = (
    "sensitivity_na_um",
    "sensitivity_se_na_um",
    "intercept_na",
    "intercept_se_na",
    "residual_sd_na",
    "r_squared",
    "n_points",
    "lod_um",
    "loq_um",
    "linear_to_um",
    "shape",
)
_AHEAD = ("calibration", "at", "stage", "analyte", "waveform")
_BEHIND = ("warnings", "electrode", "handling", "specific", "share_left", "share_left_se", "points")
_REST = tuple(one.name for one in fields(CalibrationFigures) if one.name not in (*_FIGURES, "warnings"))
_COLUMNS = (*_AHEAD, *_FIGURES, *_BEHIND, *_REST)


def as_dict(reading: Reading) -> dict[str, Any]:
    """The keys that other programs may rely on come first; the rest of what is known follows."""
    figures = reading.figures.to_dict()
    return {
        "calibration": reading.calibration,
        "at": reading.at,
        "stage": reading.stage,
        "analyte": reading.analyte,
        "waveform": reading.waveform,
        **{name: figures.pop(name) for name in _FIGURES},
        "warnings": list(reading.warnings),
        "electrode": reading.electrode,
        "handling": reading.handling.to_dict(),
        "specific": [{"value": one.value, "se": one.se, "unit": one.unit} for one in reading.specific],
        "share_left": reading.share_left,
        "share_left_se": reading.share_left_se,
        "points": [{"concentration_um": c, "current_na": i} for c, i in reading.points],
        **{name: value for name, value in figures.items() if name != "warnings"},
    }


def answer_list(
    readings: Sequence[Reading],
    json: bool,
    csv: bool,
    routes: Mapping[str, Routes] | None = None,
    others: Sequence[Reading] = (),
) -> None:
    """`routes`: detection limits by every route, by calibration, where they were asked for; `others` as in history."""
    known = routes or {}
    if json or csv:
        rows = [{**as_dict(one), **_detection_of(known.get(one.calibration))} for one in readings]
        print_json(rows) if json else print_csv([plain(row) for row in rows], None if rows else _COLUMNS)
    elif not readings:
        print_lines(none_said(others))
    else:
        for reading in readings:
            print_lines(*sentences(reading), *_route_lines(known.get(reading.calibration)))


def _detection_of(routes: Routes | None) -> dict[str, Any]:
    if routes is None:
        return {}
    return {"detection": [*routes.found, *[{"route": name, "why_not": why} for name, why in routes.why_not.items()]]}


def _route_lines(routes: Routes | None) -> list[str]:
    if routes is None:
        return []
    lines = []
    for one in routes.found:
        parts = (("critical", one.critical_um), ("detection", one.lod_um), ("quantification", one.loq_um))
        said = ", ".join(f"{name} {shown_concentration(value)}" for name, value in parts if value is not None)
        lines.append(f"  by {one.route}: {said}")
    return lines + [f"  not by {name}: {why}" for name, why in routes.why_not.items()]


def answer(readings: Sequence[Reading], json: bool) -> None:
    """After logging: one document for one calibration, a list for several."""
    if json:
        found = [as_dict(reading) for reading in readings]
        print_json(found[0] if len(found) == 1 else found)
    else:
        answer_list(readings, False, False)


def sentences(reading: Reading) -> list[str]:
    head = (reading.calibration, reading.electrode, f"{reading.stage} {reading.analyte}", reading.waveform)
    lines = ["  ".join((*head, shown_moment(reading.at))), *figure_lines(reading.figures)]
    lines += [f"  per size {_with_unit(one)}" for one in reading.specific]
    if not reading.is_reference:
        lines.append(f"  share left {share(reading)} of the reference calibration")
    if reading.handling.signal:
        lines.append(f"  from the recording {one_line(reading.handling.signal.get('file'))}")
    return lines + [f"  ! {warning}" for warning in reading.warnings]


def figure_lines(figures: CalibrationFigures) -> list[str]:
    own = with_error(figures.sensitivity_na_um, figures.sensitivity_se_na_um)
    fit = f"{figures.shape or 'factor only'}, {counted(figures.n_points, 'point')}"
    fit += f", r² {figures.r_squared:.4f}" if figures.r_squared is not None else ""
    fit += f", weights {figures.weighting}" if figures.weighting else ""
    lines = [f"  sensitivity {own} nA/µM ({fit})"]
    if figures.sensitivity_low_na_um is not None and figures.sensitivity_high_na_um is not None:
        span = shown_span(figures.sensitivity_low_na_um, figures.sensitivity_high_na_um)
        shared = " with the standard's own uncertainty" if figures.sensitivity_se_shared_na_um else ""
        allowed = f"; allows for {figures.interval_route}" if figures.interval_route else ""
        lines.append(f"  95 % interval {span} nA/µM{shared}{allowed}")
    if figures.lod_um is not None:
        loq = shown_concentration(figures.loq_um)
        lines.append(
            f"  detection limit {shown_concentration(figures.lod_um)}, quantification {loq} ({figures.lod_route})"
        )
    if figures.linear_to_um is not None:
        lines.append(f"  linear to {shown_concentration(figures.linear_to_um)}")
    return lines


def _with_unit(one: Specific) -> str:
    return f"{with_error(one.value, one.se)} {one.unit}"
