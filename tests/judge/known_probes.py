"""Probes whose odds are known in closed form: log share left after t hours is Normal(-rate·t, known spreads)."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from scipy.special import ndtr, ndtri

from electrolog.judge.facts import CalibrationFacts
from electrolog.judge.limits import LimitRow, Limits, effective
from electrolog.judge.question import Question
from electrolog.judge.shelf import Shelf

DRAWS = 1000
LEVELS = ndtri((np.arange(DRAWS) + 0.5) / DRAWS)
# Even alone and, by the golden ratio's lattice, both together: the odds are then exact to about 1 / DRAWS.
SHUFFLED = ndtri((np.arange(DRAWS) * (np.sqrt(5) - 1) / 2 + 0.5 / DRAWS) % 1)


@dataclass(frozen=True)
class Known:
    """log share left now ~ N(log_share, sd²); the loss per hour of run ~ N(rate, rate_sd²), cut at zero."""

    log_share: float = 0.0
    sd: float = 0.02
    rate: float = 0.05
    rate_sd: float = 0.0
    sensitivity_na_um: float = 10.0

    @property
    def log_reference(self) -> np.ndarray:
        return np.full(DRAWS, np.log(self.sensitivity_na_um))

    def log_sensitivity_at(self, run_min: float) -> np.ndarray:
        rate = np.maximum(self.rate + self.rate_sd * SHUFFLED, 0)
        return self.log_reference + self.log_share + self.sd * LEVELS - rate * run_min / 60

    def p_below(self, share: float, run_min: float) -> float:
        """Exact where rate_sd is small against the rate."""
        hours = run_min / 60
        spread = np.hypot(self.sd, self.rate_sd * hours)
        return float(ndtr((np.log(share) - self.log_share + self.rate * hours) / spread))


EVERYTHING = {"least-share-left": 0.7, "accepted-risk": 0.05, "oldest-calibration": 24.0}


def limits(**changed: float | None) -> Limits:
    """The three that a question needs, with what is changed (None: unset)."""
    named = {name.replace("_", "-"): value for name, value in changed.items()}
    values = {**EVERYTHING, **named}
    return effective([LimitRow(rule, value, "lab decision") for rule, value in values.items() if value is not None])


def fresh(**changed: object) -> CalibrationFacts:
    return CalibrationFacts(**{"age_h": 2.0, "noise_na": 0.05, "r_squared": 0.999, **changed})  # type: ignore[arg-type]


def question(probe: Known | None = None, run_min: float = 120.0, **changed: object) -> Question:
    probe = probe or Known()
    known = {
        "run_min": run_min,
        "log_sensitivity_at": probe.log_sensitivity_at,
        "limits": limits(),
        "calibration": fresh(),
        "reference_log_sensitivity": probe.log_reference,
    }
    return Question(**{**known, **changed})  # type: ignore[arg-type]


def shelf_of(kinds: list[tuple[Known, CalibrationFacts | None, int, str]], **changed: object) -> Shelf:
    """Of (probe, its last calibration, uses, why it is out of use)."""
    probes = [probe for probe, *_ in kinds]
    known = {
        "run_min": 120.0,
        "log_sensitivity_at": lambda minutes: np.stack([probe.log_sensitivity_at(minutes) for probe in probes]),
        "limits": limits(highest_detection_limit=0.1, lowest_r_squared=0.9, most_uses=5.0),
        "calibrations": [facts for _, facts, *_ in kinds],
        "reference_log_sensitivity": np.stack([probe.log_reference for probe in probes]),
        "uses": [uses for *_, uses, _ in kinds],
        "out_of_use": [why for *_, why in kinds],
    }
    return Shelf(**{**known, **changed})  # type: ignore[arg-type]
