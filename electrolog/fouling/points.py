"""Deterministic points that fill space evenly, for draws that are the same every time."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]


def even_points(count: int, dimensions: int) -> Floats:
    """(count, dimensions) in (0, 1): multiples of powers of the generalised golden ratio, modulo 1 (Kronecker)."""
    ratio = 2.0
    for _ in range(40):
        ratio = (1.0 + ratio) ** (1.0 / (dimensions + 1))
    steps = ratio ** -np.arange(1.0, dimensions + 1)
    return np.asarray((0.5 + np.arange(1, count + 1)[:, None] * steps) % 1.0)


def normal_points(count: int, dimensions: int) -> Floats:
    """(count, dimensions) standard normal numbers in pairs of opposite sign, each dimension of variance one."""
    from scipy.special import ndtri

    half = ndtri(even_points(count - count // 2, dimensions))
    points = np.concatenate([half, -half])[:count]
    if count < 4:
        return np.zeros((count, dimensions))
    return np.asarray(points / np.sqrt(np.mean(points**2, axis=0)))
