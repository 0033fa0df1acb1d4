"""The forecast under test, asked the same questions as the oracle."""

from __future__ import annotations

import time
from dataclasses import dataclass

import numpy as np

from electrolog.fouling.cohort import fit_cohort
from electrolog.fouling.fit import CohortFit
from electrolog.fouling.forecast import posterior
from tests.fouling.fleets.generator import Array
from tests.fouling.fleets.simulate import AHEAD_H, Fleet
from tests.fouling.fleets.told import told_fit


@dataclass(frozen=True)
class Answer:
    now: Array  # draws, (U, D)
    ahead: Array
    true_shape_weight: float  # NaN where the truth is none of the shapes
    seconds: float


def answer(fleet: Fleet) -> Answer:
    start = time.perf_counter()
    fit = fit_cohort(fleet.events)
    now, ahead = forecast(fit, fleet)
    seconds = time.perf_counter() - start
    outside = fleet.truth.generator.first_step.sd > 0
    weight = np.nan if outside else fit.shape_weights.get(fleet.truth.generator.shape.name, 0.0)
    return Answer(now, ahead, float(weight), seconds)


def answer_told(fleet: Fleet) -> Answer | None:
    """None where the truth is none of the shapes."""
    start = time.perf_counter()
    fit = told_fit(fleet.truth.generator, fleet.events)
    if fit is None:
        return None
    return Answer(*forecast(fit, fleet), 1.0, time.perf_counter() - start)


def forecast(fit: CohortFit, fleet: Fleet) -> tuple[Array, Array]:
    drawn = posterior(fit, fleet.events)
    later = np.zeros((len(fleet.events.units), len(fleet.events.settings)))
    now = drawn.log_sensitivity(later)
    later[:, fleet.events.settings.index("in-vivo")] = AHEAD_H
    return now, drawn.log_sensitivity(later)
