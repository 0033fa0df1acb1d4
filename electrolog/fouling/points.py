"""Deterministic points that fill space evenly, for draws that are the same every time."""

from __future__ import annotations

from statistics import NormalDist

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]
FEW = 50_000


def even_points(count: int, dimensions: int) -> Floats:
    """(count, dimensions) in (0, 1): the first of an even sequence."""
    return points_at(np.arange(count), dimensions)


def points_at(which: NDArray[np.int64], dimensions: int) -> Floats:
    """(..., dimensions) in (0, 1): multiples of powers of the generalised golden ratio, modulo 1 (Kronecker).

    Any stretch of consecutive ones is even.
    """
    ratio = 2.0
    for _ in range(40):
        ratio = (1.0 + ratio) ** (1.0 / (dimensions + 1))
    steps = ratio ** -np.arange(1.0, dimensions + 1)
    return np.asarray((0.5 + (which[..., None] + 1) * steps) % 1.0)


def normal_quantiles(probability: Floats) -> Floats:
    """Quantiles of the standard normal, of probability's shape.

    One probe's draws are few: the standard library (Wichura 1988, AS 241) has them sooner than scipy is imported.
    """
    if probability.size > FEW:
        from scipy.special import ndtri

        return np.asarray(ndtri(probability))
    inverse = NormalDist().inv_cdf
    return np.array([inverse(p) for p in probability.ravel().tolist()]).reshape(probability.shape)


def normal_points(count: int, dimensions: int) -> Floats:
    """(count, dimensions) standard normal numbers in pairs of opposite sign, each dimension of variance one."""
    half = normal_quantiles(even_points(count - count // 2, dimensions))
    points = np.concatenate([half, -half])[:count]
    if count < 4:
        return np.zeros((count, dimensions))
    return np.asarray(points / np.sqrt(np.mean(points**2, axis=0)))
