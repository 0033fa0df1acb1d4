"""Invented recordings with known truth: a flow cell with injections that rise and fall exponentially, and scans."""

from __future__ import annotations

from typing import Any

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]

CONCENTRATIONS = (0.25, 0.5, 1.0, 2.0)
SENSITIVITY = 12.0
OXIDATION_V, REDUCTION_V, WIDTH_V = 0.62, -0.18, 0.11


def injected(time: Array, starts: Any, lasts: float, concentration: Any, rise_s: float, fall_s: float) -> Array:
    """µM at the probe: up with `rise_s`, down with `fall_s` as time constants."""
    level = np.zeros_like(time)
    for start, c in zip(starts, concentration, strict=True):
        end = start + lasts
        up = c * (1 - np.exp(-np.maximum(time - start, 0) / rise_s))
        down = c * (1 - np.exp(-lasts / rise_s)) * np.exp(-np.maximum(time - end, 0) / fall_s)
        level += np.where(time < start, 0, np.where(time < end, up, down))
    return level


def trace(
    concentration: Any = CONCENTRATIONS,
    *,
    rate_hz: float = 10,
    lasts: float = 30,
    pause: float = 60,
    rise_s: float = 2,
    fall_s: float = 4,
    noise_na: float = 0.08,
    drift: Any = (0.5, 0.004, -2e-6),
    seed: int = 0,
) -> tuple[Array, Array, Array]:
    """Times (s), currents (nA), and when each injection began."""
    starts = 60 + np.arange(len(concentration)) * (lasts + pause)
    time = np.arange(0, starts[-1] + lasts + pause, 1 / rate_hz)
    signal = SENSITIVITY * injected(time, starts, lasts, concentration, rise_s, fall_s)
    noise = np.random.default_rng(seed).normal(0, noise_na, time.size)
    return time, signal + np.polynomial.polynomial.polyval(time, drift) + noise, starts


def sheet(
    concentration: Any = CONCENTRATIONS,
    *,
    seconds: float = 360,
    rate_hz: float = 10,
    points: int = 500,
    noise_na: float = 0.8,
    drift: float = 0.01,
    seed: int = 0,
) -> tuple[NDArray[np.float32], Array, Array, Array]:
    """Scans (n, points) in nA, potentials, times, and when each injection began: a triangle from −0.4 to 1.3 V."""
    half = points // 2
    potential = np.concatenate([np.linspace(-0.4, 1.3, half, endpoint=False), np.linspace(1.3, -0.4, points - half)])
    up = np.arange(points) < half
    charging = np.where(up, 1, -1) * (250 + 60 * potential + 80 * np.exp(-(((potential - 0.2) / 0.3) ** 2)))
    peaks = SENSITIVITY * np.exp(-(((potential - OXIDATION_V) / WIDTH_V) ** 2)) * up
    peaks = peaks - 7 * np.exp(-(((potential - REDUCTION_V) / WIDTH_V) ** 2)) * ~up
    time = np.arange(round(seconds * rate_hz)) / rate_hz
    starts = 60 + np.arange(len(concentration)) * (seconds - 60) / len(concentration)
    lasts = (seconds - 60) / len(concentration) * 0.4
    level = injected(time, starts, lasts, concentration, 2, 4)
    slow = 1 + drift * time / seconds
    noise = np.random.default_rng(seed).normal(0, noise_na, (time.size, points))
    found = slow[:, None] * charging + level[:, None] * peaks + noise
    return found.astype(np.float32), potential, time, starts
