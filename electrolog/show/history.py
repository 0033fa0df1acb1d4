"""The sensitivity history as a table."""

from __future__ import annotations

from collections import Counter
from collections.abc import Sequence
from typing import Any

from electrolog.answers.history import Reading
from electrolog.clock import shown_moment
from electrolog.show.machine import print_csv, print_json
from electrolog.show.tables import print_lines, print_table, with_error
from electrolog.units import counted, shown_number


def answer(
    readings: Sequence[Reading], json: bool, csv: bool, plain: bool = False, others: Sequence[Reading] = ()
) -> None:
    """`others`: what there is of the probes where nothing is of the analyte or waveform that was asked for."""
    rows = [as_dict(reading) for reading in readings]
    if json:
        print_json(rows)
    elif csv:
        print_csv(rows, None if rows else _KEYS)
    elif not readings:
        print_lines(none_said(others))
    elif plain:
        print_lines(*[_sentence(reading) for reading in readings], *_warned(readings))
    else:
        _print(readings)


def none_said(others: Sequence[Reading]) -> str:
    """A probe calibrated with something else isn't one that never was."""
    if not others:
        return "no calibration yet: log one with `electrolog calibrate`"
    kinds = Counter(f"{one.analyte}, {one.waveform}" for one in others)
    found = "; ".join(f"{kind} ({counted(number, 'calibration')})" for kind, number in sorted(kinds.items()))
    return f"no calibration of what was asked for; known: {found}"


_KEYS = (
    *("electrode", "calibration", "at", "stage", "analyte", "waveform", "exposure_h", "exposure_by_setting_h"),
    *("sensitivity_na_um", "sensitivity_se_na_um", "share_left", "share_left_se", "is_reference", "warnings"),
)


def as_dict(reading: Reading) -> dict[str, Any]:
    return {
        "electrode": reading.electrode,
        "calibration": reading.calibration,
        "at": reading.at,
        "stage": reading.stage,
        "analyte": reading.analyte,
        "waveform": reading.waveform,
        "exposure_h": sum(reading.exposure_h.values()),
        "exposure_by_setting_h": reading.exposure_h,
        "sensitivity_na_um": reading.figures.sensitivity_na_um,
        "sensitivity_se_na_um": reading.figures.sensitivity_se_na_um,
        "share_left": reading.share_left,
        "share_left_se": reading.share_left_se,
        "is_reference": reading.is_reference,
        "warnings": reading.warnings,
    }


def _print(readings: Sequence[Reading]) -> None:
    many = len({reading.electrode for reading in readings}) > 1
    columns = ["probe"] * many + ["calibration", "when", "stage", "analyte", "waveform", "exposed (h)"]
    columns += ["nA/µM", "share left"]
    rows = [
        [reading.electrode] * many
        + [
            reading.calibration,
            shown_moment(reading.at),
            reading.stage,
            reading.analyte,
            reading.waveform,
            shown_number(sum(reading.exposure_h.values())),
            with_error(reading.figures.sensitivity_na_um, reading.figures.sensitivity_se_na_um),
            share(reading),
        ]
        for reading in readings
    ]
    print_table(columns, rows, ("exposed (h)", "nA/µM", "share left"), ("waveform", "stage", "when", "analyte"))
    print_lines(*_warned(readings))


def _warned(readings: Sequence[Reading]) -> list[str]:
    return [f"! {reading.calibration}: {text}" for reading in readings for text in reading.warnings]


def _sentence(one: Reading) -> str:
    """One line per calibration: a table read aloud loses its columns."""
    what = f"{one.electrode}, {one.stage} {one.analyte} {one.waveform}, {shown_moment(one.at)}"
    value = with_error(one.figures.sensitivity_na_um, one.figures.sensitivity_se_na_um)
    left = "the reference" if one.is_reference else f"{share(one)} left"
    return f"{one.calibration}, {what}: {value} nA/µM after {shown_number(sum(one.exposure_h.values()))} h, {left}"


def share(reading: Reading) -> str:
    if reading.is_reference:
        return "reference"
    if reading.share_left is None:
        return "?"
    error = reading.share_left_se
    return f"{with_error(reading.share_left * 100, None if error is None else error * 100)} %"
