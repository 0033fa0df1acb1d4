"""The truth behind the lab, as read from truth.toml; and dice that depend on nothing but their name."""

from __future__ import annotations

import random
import tomllib
from collections.abc import Mapping
from pathlib import Path
from typing import Any

TRUTH: dict[str, Any] = tomllib.loads((Path(__file__).parents[1] / "truth.toml").read_text(encoding="utf-8"))


def dice(seed: int, name: str) -> random.Random:
    # One stream per name: what happens to one probe never shifts the draws of another.
    return random.Random(f"{seed}/{name}")  # noqa: S311  (an invented lab, no secret)


def drawn(rng: random.Random, shares: Mapping[str, float]) -> str:
    return rng.choices(list(shares), weights=list(shares.values()))[0]
