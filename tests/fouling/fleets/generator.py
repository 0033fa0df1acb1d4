"""The distribution that a fleet is drawn from, written out so that the simulator and the oracle share it.

y of a reading = level − loss(clock; shape, half-life) − step at the first exposure − damage
                 + log area changes + day effect + slip + error
"""

from __future__ import annotations

from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]
LN10 = float(np.log(10.0))


@dataclass(frozen=True)
class Shape:
    """Loss of log sensitivity after `clock_h` hours in vivo; the half-life is of what fouls (slowly)."""

    name: str
    plateau: float = 0.0
    fast_share: float = 0.0
    fast_times: float = 1.0
    log_exponent_mean: float = 0.0
    log_exponent_sd: float = 0.0

    def loss(self, clock_h: Array, log_half_life: Array, log_exponent: Array) -> Array:
        half_lives: Array = np.asarray(clock_h) / np.exp(log_half_life)
        match self.name:
            case "none":
                return 0.0 * half_lives
            case "exponential":
                return half_lives * float(np.log(2))
            case "plateau":
                return -np.log(self.plateau + (1 - self.plateau) * np.exp2(-half_lives))
            case "fast-then-slow":
                fast, slow = np.exp2(-half_lives * self.fast_times), np.exp2(-half_lives)
                return -np.log(self.fast_share * fast + (1 - self.fast_share) * slow)
            case "square-root":
                return np.sqrt(half_lives) * float(np.log(2))
            case "patch":
                return np.asarray(np.log(2) * half_lives ** np.exp(log_exponent))
        raise ValueError(self.name)


@dataclass(frozen=True)
class Renewal:
    """Winds the fouling clock back by `recovery` of its hours; a cut also changes the area."""

    name: str
    share: float
    recovery: float
    log_area_mean: float = 0.0
    log_area_sd: float = 0.0


@dataclass(frozen=True)
class Gaussian:
    mean: float
    sd: float


@dataclass(frozen=True)
class Generator:
    family: str
    shape: Shape
    n_units: int
    level: Gaussian  # log(nA/µM)
    log_half_life: Gaussian  # log hours in vivo
    day_sd: float
    repeat_sd: float  # of a calibration done again on the same day, beyond its line's own error
    reading_counts: tuple[int, ...] = (2, 3, 4, 5, 6, 7)
    readings_per_day: float = 16.0
    days_between: float = 10.0  # readings of one probe, on average, unless on the same day
    bad_day_share: float = 0.0
    bad_day_sd: float = 0.0
    settings: tuple[str, ...] = ("in-vivo",)
    setting_weights: tuple[float, ...] = (1.0,)
    setting_shares: tuple[float, ...] = (1.0,)
    renewals: tuple[Renewal, ...] = ()
    renewal_share: float = 0.0  # of the places where a cleaning can stand
    coatings: tuple[str, ...] = ("bare",)
    coating_level: tuple[float, ...] = (0.0,)
    coating_log_half_life: tuple[float, ...] = (0.0,)
    batch_size: int = 12
    batch_level_sd: float = 0.0
    batch_log_half_life_sd: float = 0.0
    slip_share: float = 0.0  # of readings; at most two a unit
    damage_share: float = 0.0  # of units with a run
    damage: Gaussian = field(default_factory=lambda: Gaussian(0.0, 0.0))
    first_step: Gaussian = field(default_factory=lambda: Gaussian(0.0, 0.0))
    break_log_odds: tuple[float, float] | None = None  # of a run: at no loss, and per unit of loss

    def log_survival(self, loss: Array) -> Array:
        """Log probability that a run which ends at this loss doesn't break the probe."""
        if self.break_log_odds is None:
            return np.zeros_like(loss)
        at_none, per_loss = self.break_log_odds
        return -np.logaddexp(0, at_none + per_loss * loss)
