"""The concentration that a current stands for, by one calibration, with its interval."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from electrolog.answers.answer import Answer
from electrolog.answers.figures import standards_uncertainties
from electrolog.answers.history import Reading, readings_of
from electrolog.errors import DataError, InputError
from electrolog.measure.inverse import InversePrediction, predict_concentration
from electrolog.measure.line import LineFit, fit_line, levels_um
from electrolog.record.store import Record


@dataclass(frozen=True)
class ReadOff(Answer):
    """`standard_relative_uncertainty` is beside the intervals, not in them: every probe of that day shares it."""

    calibration: str
    electrode: str
    analyte: str
    current_na: float
    replicates: int
    confidence: float
    prediction: InversePrediction
    standard_relative_uncertainty: float | None
    warnings: tuple[str, ...]


def read_off(record: Record, calibration: str, current_na: Sequence[float], confidence: float = 0.95) -> ReadOff:
    """Raises DataError for a calibration that is no line, InputError for no current."""
    if not current_na:
        raise InputError("current: missing; accepted: one or several replicates, such as 5.2nA,5.4nA")
    reading = readings_of(record, [calibration])[0]
    line, mean_na = _line(reading), float(np.mean(current_na))
    prediction = predict_concentration(
        line, mean_na, len(current_na), weight=_weight_at(line, mean_na), confidence=confidence
    )
    with record.reading() as connection:
        shared = standards_uncertainties(connection).get(reading.row["standard"])
    return ReadOff(
        calibration=reading.calibration,
        electrode=reading.electrode,
        analyte=reading.analyte,
        current_na=mean_na,
        replicates=len(current_na),
        confidence=confidence,
        prediction=prediction,
        standard_relative_uncertainty=shared,
        warnings=(*_outside(line, prediction), *reading.warnings),
    )


def _line(reading: Reading) -> LineFit:
    shape = reading.figures.shape
    if not reading.points or shape is None:
        raise DataError(f"{reading.calibration} kept no points: without them there is no interval")
    if shape == "saturating":
        raise DataError(
            f"{reading.calibration} levels off: a straight line can't be read backwards there",
            "calibrate with points below where it is linear, and read off that calibration",
        )
    concentrations, currents = zip(*reading.points, strict=True)
    weights = reading.handling.weights_of(reading.points) if reading.figures.weighting else None
    return fit_line(concentrations, currents, through_zero=shape == "line-through-zero", weights=weights)


def _weight_at(line: LineFit, mean_na: float) -> float:
    """A new measurement scatters as the calibration's points do at that concentration."""
    levels = levels_um(line.concentration_um)
    known = [float(line.weights[line.concentration_um == level].mean()) for level in levels]
    at_um = (mean_na - line.intercept_na) / line.slope_na_um if line.slope_na_um else 0.0
    return float(np.interp(at_um, levels, known))


def _outside(line: LineFit, prediction: InversePrediction) -> list[str]:
    found, low, high = prediction.concentration_um, line.concentration_um.min(), line.concentration_um.max()
    if found is None or low <= found <= high:
        return []
    return [f"{found:.3g} µM lies outside what was calibrated ({low:g} to {high:g} µM): there the line is a guess"]
