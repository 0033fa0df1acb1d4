"""The forecast under test, asked the same questions as the oracle."""

from __future__ import annotations

import time
from dataclasses import dataclass

import numpy as np

from tests.fouling.fleets.generator import Array
from tests.fouling.fleets.simulate import AHEAD_H, Fleet


@dataclass(frozen=True)
class Answer:
    now: Array  # draws, (U, D)
    ahead: Array
    true_shape_weight: float  # NaN where the truth is none of the shapes
    seconds: float


def answer(fleet: Fleet) -> Answer:
    """Raises ImportError where the fit isn't there."""
    from electrolog.fouling.cohort import fit_cohort
    from electrolog.fouling.forecast import posterior

    start = time.perf_counter()
    fit = fit_cohort(fleet.events)
    forecast = posterior(fit, fleet.events)
    later = np.zeros((len(fleet.events.units), len(fleet.events.settings)))
    now = forecast.log_sensitivity(later)
    later[:, fleet.events.settings.index("in-vivo")] = AHEAD_H
    ahead = forecast.log_sensitivity(later)
    seconds = time.perf_counter() - start
    outside = fleet.truth.generator.first_step.sd > 0
    weight = np.nan if outside else fit.shape_weights.get(fleet.truth.generator.shape.name, 0.0)
    return Answer(now, ahead, float(weight), seconds)
