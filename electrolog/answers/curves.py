"""The curve by which a run's currents are read: that of the calibrations on both sides of it."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

from electrolog.errors import DataError
from electrolog.fouling.conversion import Curve
from electrolog.measure.calibrate import CalibrationFigures
from electrolog.measure.saturating import fit_saturating
from electrolog.record.queries import Calibration


@dataclass(frozen=True)
class ReadBy:
    """`highest_um`: the highest concentration calibrated; None where points weren't kept. `said`: what was assumed."""

    curve: Curve
    highest_um: float | None
    said: tuple[str, ...]


def read_by(calibrations: Sequence[Calibration], figures: Sequence[CalibrationFigures]) -> ReadBy:
    """One or two calibrations, the one before the run first; the shape is the first's."""
    offset_na, offset_se_na = _offset(figures)
    noise = [calibration.row["noise_na"] for calibration in calibrations if calibration.row["noise_na"]]
    levels = [concentration for calibration in calibrations for concentration, _ in calibration.points]
    affinity = _affinity_per_um(calibrations[0]) if figures[0].shape == "saturating" else 0.0
    said = []
    if not any(calibration.points for calibration in calibrations):
        said.append("only the factor was kept of these calibrations: a straight line through zero is assumed")
    if not noise:
        said.append("the signal's noise isn't on record: the band is without it, as for a mean of many samples")
    curve = Curve(offset_na, offset_se_na, math.fsum(noise) / len(noise) if noise else 0.0, affinity)
    return ReadBy(curve, max(levels, default=None), tuple(said))


def _offset(figures: Sequence[CalibrationFigures]) -> tuple[float, float]:
    """Mean of the intercepts by their precision; where they disagree, its error is as large as that says."""
    known = [(f.intercept_na, f.intercept_se_na) for f in figures if f.intercept_na is not None]
    sure = [(value, se) for value, se in known if se]
    if not sure:
        return math.fsum(value for value, _ in known) / max(len(known), 1), 0.0
    weights = [1 / se**2 for _, se in sure]
    mean = math.fsum(w * value for w, (value, _) in zip(weights, sure, strict=True)) / sum(weights)
    misfit = math.fsum(w * (value - mean) ** 2 for w, (value, _) in zip(weights, sure, strict=True))
    return mean, math.sqrt(max(1.0, misfit) / sum(weights))


def _affinity_per_um(calibration: Calibration) -> float:
    concentration_um, current_na = zip(*calibration.points, strict=True)
    try:
        return fit_saturating(concentration_um, current_na).affinity_per_um
    except DataError:
        return 0.0
