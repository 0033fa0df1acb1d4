"""What every shape of loss answers."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Protocol

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]


@dataclass(frozen=True)
class Prior:
    """A normal prior on an unbounded scale, with the words that state it."""

    name: str
    mean: float
    sd: float


@dataclass(frozen=True)
class Loss:
    """Loss of log sensitivity, its slope per hour on the clock, and its slope in each parameter (last axis)."""

    value: Floats
    per_hour: Floats
    per_parameter: tuple[Floats, ...]


class Shape(Protocol):
    """One shape of loss: how log sensitivity falls with hours on the clock.

    `latents` differ from unit to unit: the prior of each one's cohort mean; the first, if there is one, is the log
    rate per
    hour in vivo. `latent_sds` are the priors of the log of their standard deviations between units. `parameters`
    are shared
    by the cohort.
    """

    name: str
    formula: str
    latents: tuple[Prior, ...]
    latent_sds: tuple[Prior, ...]
    parameters: tuple[Prior, ...]

    def loss(self, hours: Floats, latents: Floats, parameters: Floats) -> Loss:
        """hours broadcasts against latents[..., k] and parameters[..., p]."""
        ...

    def half_life_hours(self, latents: Floats, parameters: Floats) -> Floats:
        """Hours in vivo until half of the sensitivity is lost; inf where it never is."""
        ...


# The log of loss per hour in vivo: a half-life of 14 hours, with 2 hours and 4 days two standard deviations away.
LOG_RATE = Prior("log rate per hour in vivo", float(np.log(0.05)), 1.0)
LOG_RATE_SD = Prior("log sd of log rate between units", float(np.log(0.4)), 0.6)
LOG_TWO = float(np.log(2.0))
