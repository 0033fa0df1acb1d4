"""A calibration said back in full, and the list of exchange.md's keys."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

from electrolog.answers.history import Reading
from electrolog.clock import shown_moment
from electrolog.show.history import share
from electrolog.show.machine import plain, print_csv, print_json
from electrolog.show.tables import print_lines, with_error
from electrolog.units import shown_concentration, shown_number

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
        "share_left": reading.share_left,
        "share_left_se": reading.share_left_se,
        "points": [{"concentration_um": c, "current_na": i} for c, i in reading.points],
        **{name: value for name, value in figures.items() if name != "warnings"},
    }


def answer_list(readings: Sequence[Reading], json: bool, csv: bool) -> None:
    if json:
        print_json([as_dict(reading) for reading in readings])
    elif csv:
        print_csv([plain(as_dict(reading)) for reading in readings])
    elif not readings:
        print_lines("no calibration yet: log one with `electrolog calibrate`")
    else:
        for reading in readings:
            print_lines(*sentences(reading))


def answer(readings: Sequence[Reading], json: bool) -> None:
    """After logging: one document for one calibration, a list for several."""
    if json:
        found = [as_dict(reading) for reading in readings]
        print_json(found[0] if len(found) == 1 else found)
    else:
        answer_list(readings, False, False)


def sentences(reading: Reading) -> list[str]:
    figures = reading.figures
    own = with_error(figures.sensitivity_na_um, figures.sensitivity_se_na_um)
    fit = f"{figures.shape or 'factor only'}, {figures.n_points} points"
    fit += f", r² {figures.r_squared:.4f}" if figures.r_squared is not None else ""
    head = (reading.calibration, reading.electrode, f"{reading.stage} {reading.analyte}", reading.waveform)
    lines = ["  ".join((*head, shown_moment(reading.at))), f"  sensitivity {own} nA/µM ({fit})"]
    if figures.sensitivity_low_na_um is not None:
        low, high = shown_number(figures.sensitivity_low_na_um), shown_number(figures.sensitivity_high_na_um)
        shared = " with the standard's own uncertainty" if figures.sensitivity_se_shared_na_um else ""
        lines.append(f"  95 % interval {low} to {high} nA/µM{shared}")
    if figures.lod_um is not None:
        loq = shown_concentration(figures.loq_um)
        lines.append(
            f"  detection limit {shown_concentration(figures.lod_um)}, quantification {loq} ({figures.lod_route})"
        )
    if figures.linear_to_um is not None:
        lines.append(f"  linear to {shown_concentration(figures.linear_to_um)}")
    if not reading.is_reference:
        lines.append(f"  share left {share(reading)} of the reference calibration")
    return lines + [f"  ! {warning}" for warning in reading.warnings]
