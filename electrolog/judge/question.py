"""What is asked of one probe: everything that the verdict needs to know."""

from __future__ import annotations

import math
from collections.abc import Callable, Mapping
from dataclasses import dataclass, field
from typing import Protocol

import numpy as np
from numpy.typing import NDArray

from electrolog.errors import InputError
from electrolog.judge.facts import CalibrationFacts
from electrolog.judge.limits import Limits

Array = NDArray[np.float64]


@dataclass(frozen=True)
class Question:
    """One probe, one analyte and waveform, one run.

    log_sensitivity_at: minutes of run -> (D,) draws of the true log sensitivity (nA/µM) after it, 0 for now.
    reference_log_sensitivity: (D,) the same draws' log sensitivity at the reference calibration; None: there is none.
    calibration: None if it was never calibrated with this analyte and waveform. reading_sd_log: how far one
    calibration strays from the truth (log units, day effect included). after_cleaning: per cleaning method of the
    lab's, the same callable for the probe cleaned now. out_of_use: why nobody can use it, "" if somebody can.
    """

    run_min: float
    log_sensitivity_at: Callable[[float], Array]
    limits: Limits
    calibration: CalibrationFacts | None
    reference_log_sensitivity: Array | None = None
    reading_sd_log: float = 0.05
    needs_um: float | None = None
    uses: int = 0
    assay: str = "this analyte and waveform"
    out_of_use: str = ""
    after_cleaning: Mapping[str, Callable[[float], Array]] = field(default_factory=dict)


class Asked(Protocol):
    @property
    def run_min(self) -> float: ...
    @property
    def needs_um(self) -> float | None: ...


def refuse_nonsense(question: Asked) -> None:
    """Raises InputError for a run that isn't longer than zero, or a needed concentration that isn't above zero."""
    if not (math.isfinite(question.run_min) and question.run_min > 0):
        raise InputError(f"the run is {question.run_min:g} min long; accepted: longer than zero", "give --run 2h")
    needs = question.needs_um
    if needs is not None and not (math.isfinite(needs) and needs > 0):
        raise InputError(f"the needed concentration is {needs:g} µM; accepted: above zero", "give --needs 50nM")
