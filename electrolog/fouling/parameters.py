"""The hyper-parameters of a cohort under one shape: which there are, their wide priors, and what a vector of them
means.

Every one lives on an unbounded scale (log, logit) and has a normal prior there; a fit starts at the priors' means.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from electrolog.fouling.points import normal_quantiles
from electrolog.fouling.shapes.shape import Prior, Shape

Floats = NDArray[np.float64]
IN_VIVO = "in-vivo"

LEVEL_SD = Prior("log sd of level between units", float(np.log(0.35)), 0.5)
RESIDUAL_SD = Prior("log sd of a reading beyond its line's own error", float(np.log(0.03)), 0.7)
DAY_SD = Prior("log sd of day effects", float(np.log(0.05)), 0.5)
GROUP_SD = float(np.log(0.15)), 0.8
BAD_DAY_SD = Prior("log sd of a bad day's effect", float(np.log(0.35)), 0.5)
BAD_DAY = Prior("log odds of a bad day", float(np.log(0.03)), 1.0)
SLIP = Prior("log odds of a slip, per reading", float(np.log(0.01)), 1.0)
DAMAGE = Prior("log odds of sudden damage, per reading", float(np.log(0.005)), 1.0)
COMMON = 7  # hyper-parameters that every cohort has
WEIGHT = -0.7, 1.3
RECOVERY = {"clean": (-0.5, 1.5), "recoat": (1.0, 1.5), "recut": (2.0, 1.5)}


@dataclass(frozen=True)
class Layout:
    """Where each hyper-parameter stands in the vector theta (P,)."""

    shape: Shape
    settings: tuple[str, ...]
    renewals: tuple[str, ...]
    group_sds: tuple[tuple[str, str], ...]  # (level | rate, factor)

    @property
    def priors(self) -> tuple[Prior, ...]:
        groups = tuple(
            Prior(f"log sd of {what} between values of {factor}", *GROUP_SD) for what, factor in self.group_sds
        )
        weights = tuple(Prior(f"log weight of {name}", *WEIGHT) for name in self.free_settings)
        recoveries = tuple(Prior(f"logit recovery by {name}", *_recovery(name)) for name in self.renewals)
        scales = (LEVEL_SD, RESIDUAL_SD, DAY_SD, BAD_DAY_SD, BAD_DAY, SLIP, DAMAGE, *self.shape.latent_sds)
        return scales + groups + weights + recoveries + self.shape.parameters

    @property
    def free_settings(self) -> tuple[str, ...]:
        return tuple(name for name in self.settings if name != IN_VIVO)

    @property
    def latent_slots(self) -> slice:
        return slice(COMMON, COMMON + len(self.shape.latents))

    @property
    def group_slots(self) -> slice:
        start = self.latent_slots.stop
        return slice(start, start + len(self.group_sds))

    @property
    def weight_slots(self) -> slice:
        start = self.group_slots.stop
        return slice(start, start + len(self.free_settings))

    @property
    def recovery_slots(self) -> slice:
        start = self.weight_slots.stop
        return slice(start, start + len(self.renewals))

    @property
    def shape_slots(self) -> slice:
        start = self.recovery_slots.stop
        return slice(start, start + len(self.shape.parameters))


def _recovery(name: str) -> tuple[float, float]:
    return RECOVERY.get(name.split(":", maxsplit=1)[0], RECOVERY["clean"])


@dataclass(frozen=True)
class Scales:
    """What theta (..., P) means; every member has theta's leading axes."""

    level_sd: Floats
    residual_sd: Floats
    day_sd: Floats
    bad_day_sd: Floats
    bad_day_odds: Floats
    slip_odds: Floats
    damage_odds: Floats
    latent_sds: Floats  # (..., q)
    group_sds: Floats  # (..., g)
    weight: Floats  # (..., S), 1 for the reference setting
    recovery: Floats  # (..., M)
    shape: Floats  # (..., p), on the shape's own unbounded scale


def read_scales(layout: Layout, theta: Floats) -> Scales:
    common = np.exp(theta[..., :COMMON])
    weight = np.ones((*theta.shape[:-1], len(layout.settings)))
    free = [k for k, name in enumerate(layout.settings) if name != IN_VIVO]
    weight[..., free] = np.exp(theta[..., layout.weight_slots])
    level, residual, day, bad_day, bad_odds, slips, damage = np.moveaxis(common, -1, 0)
    return Scales(
        level,
        residual,
        day,
        bad_day,
        bad_odds,
        slips,
        damage,
        np.exp(theta[..., layout.latent_slots]),
        np.exp(theta[..., layout.group_slots]),
        weight,
        1.0 / (1.0 + np.exp(-theta[..., layout.recovery_slots])),
        theta[..., layout.shape_slots],
    )


def prior_draws(what: str, name: str, count: int, spin: int | None) -> Floats:
    """Draws of a setting's weight or a method's recovery that no fit has seen, from its prior; spin None: the
    median."""
    mean, sd = WEIGHT if what == "weight" else _recovery(name)
    if what == "weight" and name == IN_VIVO:
        return np.ones(count)
    golden = 0.6180339887498949
    spread = (0.5 + (np.arange(count) + (spin or 0)) * golden) % 1.0
    level = np.full(count, 0.5) if spin is None else np.asarray(spread, dtype=np.float64)
    at = mean + sd * normal_quantiles(level)
    return np.exp(at) if what == "weight" else 1.0 / (1.0 + np.exp(-at))
