"""What distinguishes one family of fleets from another: the generator that a seed draws for it."""

from __future__ import annotations

import zlib
from dataclasses import replace
from typing import Any

import numpy as np

from tests.fouling.fleets.generator import Gaussian, Generator, Renewal, Shape

FAMILIES = (
    "none",
    "exponential",
    "plateau",
    "fast-then-slow",
    "square-root",
    "patch",
    "patch-per-probe",
    "mixed-settings",
    "cleanings",
    "coatings",
    "slips",
    "bad-days",
    "young-lab",
    "sudden-damage",
    "informative-loss",
    "outside",
)


def stream(*keys: str | int) -> np.random.Generator:
    """A stream of random numbers of its own for every name."""
    return np.random.default_rng([zlib.crc32(k.encode()) if isinstance(k, str) else k for k in keys])


def generator(family: str, seed: int, n_units: int = 300) -> Generator:
    if family not in FAMILIES:
        raise ValueError(f"no family is called {family}; known: {', '.join(FAMILIES)}")
    rng = stream("generator", family, seed)
    plain = _plain_lab(family, n_units, _shape(family, seed, rng), rng)
    return replace(plain, **_trait(family, rng))


def _plain_lab(family: str, n_units: int, shape: Shape, rng: np.random.Generator) -> Generator:
    return Generator(
        family=family,
        shape=shape,
        n_units=n_units,
        level=Gaussian(rng.uniform(1.5, 3.5), rng.uniform(0.3, 0.5)),
        log_half_life=Gaussian(np.log(rng.uniform(11, 20)), rng.uniform(0.4, 0.7)),
        day_sd=rng.uniform(0.03, 0.08),
        repeat_sd=rng.uniform(0.02, 0.05),
    )


def _shape(family: str, seed: int, rng: np.random.Generator) -> Shape:
    shapes = {
        "none": Shape("none"),
        "exponential": Shape("exponential"),
        "plateau": Shape("plateau", plateau=rng.uniform(0.3, 0.5)),
        "fast-then-slow": Shape("fast-then-slow", fast_share=rng.uniform(0.2, 0.4), fast_times=rng.uniform(10, 25)),
        "square-root": Shape("square-root"),
        "patch": Shape("patch", log_exponent_mean=np.log(rng.choice([0.7, 1.5]))),
        "patch-per-probe": Shape("patch", log_exponent_mean=np.log(rng.uniform(0.9, 1.4)), log_exponent_sd=0.3),
        "outside": Shape("exponential"),
    }
    in_turn = ("exponential", "fast-then-slow", "square-root", "plateau")
    return shapes.get(family) or shapes[in_turn[seed % len(in_turn)]]


def _trait(family: str, rng: np.random.Generator) -> dict[str, Any]:
    solvent = Renewal("clean:solvent", 0.7, rng.uniform(0.3, 0.7))
    cut = Renewal("recut", 0.3, 0.95, log_area_mean=-0.2, log_area_sd=0.15)
    traits: dict[str, dict[str, Any]] = {
        "mixed-settings": {
            "settings": ("in-vivo", "slice", "flow-cell"),
            "setting_weights": (1.0, rng.uniform(0.3, 0.7), rng.uniform(0.03, 0.15)),
            "setting_shares": (0.4, 0.35, 0.25),
        },
        "cleanings": {"renewals": (solvent, cut), "renewal_share": 0.3},
        "coatings": {
            "coatings": ("bare", "PFSA"),
            "coating_level": (0.0, -0.3),
            "coating_log_half_life": (0.0, rng.uniform(0.4, 0.8)),
            "batch_level_sd": 0.2,
            "batch_log_half_life_sd": 0.25,
        },
        "slips": {"slip_share": 0.02},
        "bad-days": {"bad_day_share": 0.08, "bad_day_sd": 0.4},
        "young-lab": {"n_units": 24, "reading_counts": (1, 2), "readings_per_day": 7.0},
        "sudden-damage": {"damage_share": 0.06, "damage": Gaussian(0.9, 0.3)},
        "informative-loss": {"break_log_odds": (-4.5, 3.0)},
        "outside": {"first_step": Gaussian(0.3, 0.12)},
    }
    return traits.get(family, {})
