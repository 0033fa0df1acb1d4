"""Detection limits of a calibration by every recognised route, or why a route gives none."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, replace

import numpy as np

from electrolog.answers.answer import Answer
from electrolog.answers.history import Reading
from electrolog.errors import ElectrologError
from electrolog.measure import detection
from electrolog.measure.detection import Limits
from electrolog.measure.line import LineFit, fit_line


@dataclass(frozen=True)
class Routes(Answer):
    found: tuple[Limits, ...]
    why_not: dict[str, str]


def routes(reading: Reading) -> Routes:
    sensitivity, noise_na = reading.figures.sensitivity_na_um, reading.row["noise_na"]
    if sensitivity is None or not sensitivity > 0:
        return Routes((), {"every route": "there is no sensitivity above zero"})
    blanks = [current for concentration, current in reading.points if concentration == 0]
    tried: dict[str, Callable[[], Limits]] = {
        "3 × the signal's noise / sensitivity": lambda: detection.from_noise(_measured(noise_na), sensitivity),
        "IUPAC 1995 (Currie), the signal's noise": lambda: detection.currie(_measured(noise_na), sensitivity),
        f"3 × standard deviation of the {len(blanks)} blanks / sensitivity": lambda: detection.from_blanks(
            blanks, sensitivity
        ),
        "IUPAC 1995 (Currie), the blanks": lambda: detection.currie(_sd(blanks), sensitivity, len(blanks) - 1),
        "3 × residual standard deviation / sensitivity": lambda: detection.from_residuals(
            _line(reading).residual_sd_na, sensitivity
        ),
        "ISO 11843-2": lambda: detection.iso_11843(_line(reading)),
        "Hubaux–Vos prediction bands": lambda: detection.hubaux_vos(_line(reading)),
    }
    found, why_not = [], {}
    for name, route in tried.items():
        try:
            found.append(replace(route(), route=name))
        except ElectrologError as why:
            why_not[name] = why.message
    return Routes(tuple(found), why_not)


def _measured(noise_na: float | None) -> float:
    if not noise_na:
        raise ElectrologError("no noise was measured with this calibration")
    return noise_na


def _sd(blanks: list[float]) -> float:
    if len(blanks) < 2:
        raise ElectrologError(f"{len(blanks)} blanks give no standard deviation; two or more are needed")
    return float(np.std(blanks, ddof=1))


def _line(reading: Reading) -> LineFit:
    """These routes rest on a line with one scatter throughout."""
    if reading.figures.shape not in ("line", "line-through-zero"):
        raise ElectrologError(f"the calibration is no line ({reading.figures.shape or 'only the factor was kept'})")
    if reading.figures.weighting:
        raise ElectrologError(
            f"it needs one scatter at all concentrations; these were weighted {reading.handling.weights}"
        )
    concentrations, currents = zip(*reading.points, strict=True)
    line = fit_line(concentrations, currents, through_zero=reading.figures.shape == "line-through-zero")
    if line.degrees_of_freedom < 1 or line.exact():
        raise ElectrologError("the points leave no scatter to judge by")
    return line
