"""How good a forecast was: rows are units, columns (weighted) draws of the forecast."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from tests.fouling.fleets.generator import Array

LEVELS = (0.5, 0.8, 0.9)


@dataclass(frozen=True)
class Score:
    crps: float
    log_score: float
    coverage: tuple[float, ...]  # at LEVELS
    pit: Array
    n: int


def score(draws: Array, truth: Array, weights: Array | None = None) -> Score:
    w = np.full(draws.shape, 1 / draws.shape[1]) if weights is None else weights
    order = np.argsort(draws, axis=1)
    x, w = np.take_along_axis(draws, order, 1), np.take_along_axis(w, order, 1)
    places = pit(x, truth, w)
    return Score(
        crps=float(np.mean(crps(x, truth, w))),
        log_score=float(np.mean(log_score(x, truth, w))),
        coverage=tuple(float(np.mean(np.abs(places - 0.5) <= level / 2)) for level in LEVELS),
        pit=places,
        n=truth.size,
    )


def crps(x: Array, truth: Array, weights: Array) -> Array:
    """Of sorted weighted draws, exactly: E|X − truth| − E|X − X'| / 2 (Gneiting and Raftery 2007)."""
    below = np.cumsum(weights, axis=1)[:, :-1]
    spread = np.sum(below * (1 - below) * np.diff(x, axis=1), axis=1)
    return np.asarray(np.sum(weights * np.abs(x - truth[:, None]), axis=1) - spread)


def pit(x: Array, truth: Array, weights: Array) -> Array:
    return np.asarray(np.sum(weights * ((x < truth[:, None]) + 0.5 * (x == truth[:, None])), axis=1))


def log_score(x: Array, truth: Array, weights: Array) -> Array:
    """−log density at the truth, the draws smoothed by Gaussians of Silverman's width (1986)."""
    mean = np.sum(weights * x, axis=1)
    sd = np.sqrt(np.sum(weights * (x - mean[:, None]) ** 2, axis=1))
    width = 0.9 * np.minimum(sd, _quartile_range(x, weights) / 1.349) * np.sum(weights**2, axis=1) ** 0.2
    width = np.maximum(width, 1e-9)[:, None]
    heights = np.exp(-(((x - truth[:, None]) / width) ** 2) / 2) / (width * np.sqrt(2 * np.pi))
    return np.asarray(-np.log(np.maximum(np.sum(weights * heights, axis=1), 1e-12)))


def _quartile_range(x: Array, weights: Array) -> Array:
    below = np.cumsum(weights, axis=1)
    low, high = (np.argmax(below >= q, axis=1)[:, None] for q in (0.25, 0.75))
    return np.asarray((np.take_along_axis(x, high, 1) - np.take_along_axis(x, low, 1))[:, 0])
