"""A cohort's fit as it is kept: what the lab's probes have taught, and what a forecast needs of it."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from electrolog.fouling.covariance import Covariance
from electrolog.fouling.effects import Effects
from electrolog.fouling.line_error import LineError
from electrolog.fouling.parameters import Layout

Floats = NDArray[np.float64]
METHOD = "cohort-5"


@dataclass(frozen=True)
class KeptUnits:
    """Stand-ins of the units of one batch: to see the shared effects without a unit's own contribution."""

    labels: tuple[str, ...]
    columns: NDArray[np.int64]  # (B, R, e)
    precision: Floats  # (B, R, R)
    shift: Floats  # (B, R)


@dataclass(frozen=True)
class Component:
    """One shape's fit: theta at its peak (P,) and K draws (K, P); shared effects (F,), (K, F), (F + 1, F + 1)."""

    layout: Layout
    effects: Effects
    weight: float
    theta: Floats
    theta_draws: Floats
    theta_covariance: Floats
    mean: Floats
    mean_draws: Floats
    covariance: Covariance
    units: tuple[KeptUnits, ...]


@dataclass(frozen=True)
class CohortFit:
    """`notes` say in words what the data can't tell. Made by fit_cohort; plain data by to_dict and from_dict."""

    method: str
    fingerprint: str
    line_error: LineError
    shape_weights: dict[str, float]
    components: tuple[Component, ...]
    n_units: int
    n_readings: int
    converged: bool
    notes: tuple[str, ...]
    summary: dict[str, Any]

    def to_dict(self) -> dict[str, Any]:
        from electrolog.fouling.kept import to_dict

        return to_dict(self)

    @staticmethod
    def from_dict(kept: Mapping[str, Any]) -> CohortFit:
        from electrolog.fouling.kept import from_dict

        return from_dict(kept)
