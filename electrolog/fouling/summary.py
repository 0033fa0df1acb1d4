"""What the fit tells of the cohort, as plain data: shapes, half-lives, settings, renewals, days, slips, and what
each rests on."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from electrolog.fouling.clock import run_clock
from electrolog.fouling.covariance import between, variances
from electrolog.fouling.events import EXPOSURE, READING, RENEWAL, Events
from electrolog.fouling.fit import Component
from electrolog.fouling.parameters import IN_VIVO, read_scales
from electrolog.fouling.points import normal_points
from electrolog.fouling.propagation import Outcome, Problem
from electrolog.fouling.shapes import SHAPES

Floats = NDArray[np.float64]
PER_DRAW = 32  # draws of the shared effects under each draw of the hyper-parameters
SUSPICIOUS = 0.5  # probability from which a day, a reading or a probe is named


@dataclass(frozen=True)
class Fitted:
    """A shape that has weight: its problem, what the last sweep found, and what is kept of it."""

    problem: Problem
    outcome: Outcome
    part: Component


def summarise(events: Events, fitted: list[Fitted], shape_weights: dict[str, float]) -> dict[str, Any]:
    """Intervals are 90 %; half-lives are those of the typical probe of a group, in hours in vivo (None: never
    halves)."""
    return {
        "shapes": [
            {"shape": name, "weight": weight, "formula": SHAPES[name].formula} for name, weight in shape_weights.items()
        ],
        "half_lives": half_lives(events, fitted),
        "settings": [setting(events, fitted, k) for k in range(len(events.settings))],
        "renewals": [renewal(events, fitted, k) for k in range(len(events.renewals))],
        "days": days(events, fitted),
        "slips": slips(events, fitted),
        "damaged": damaged(events, fitted),
        "spreads": spreads(fitted),
        "longest_hours": longest_hours(events, fitted),
    }


def longest_hours(events: Events, fitted: list[Fitted]) -> float:
    """The most that any reading's clock has shown, worth as hours in vivo: nothing was seen beyond."""
    scales = [read_scales(one.part.layout, one.part.theta) for one in fitted]
    clocks = [run_clock(events, scale.weight, scale.recovery).at_readings for scale in scales]
    return max((float(at.max(initial=0.0)) for at in clocks), default=0.0)


def interval(draws: Floats) -> dict[str, float | None]:
    low, middle, high = np.quantile(draws, [0.05, 0.5, 0.95], method="inverted_cdf")
    return {"median": finite(middle), "low": finite(low), "high": finite(high)}


def finite(value: float) -> float | None:
    return float(value) if np.isfinite(value) else None


def half_lives(events: Events, fitted: list[Fitted]) -> list[dict[str, Any]]:
    coating, waveform = (events.groups.get(f, ("",) * len(events.units)) for f in ("coating", "waveform"))
    counts = np.bincount(events.unit[events.kind == READING], minlength=len(events.units))
    rows = []
    for pair in sorted(set(zip(coating, waveform, strict=True))):
        mine = np.array([own == pair for own in zip(coating, waveform, strict=True)])
        draws = np.concatenate([typical_half_life(one.part, *pair) for one in fitted])
        rests_on = {"n_probes": int(mine.sum()), "n_calibrations": int(counts[mine].sum())}
        rows.append({"coating": pair[0], "waveform": pair[1], **interval(draws), **rests_on})
    return rows


def typical_half_life(part: Component, coating: str, waveform: str) -> Floats:
    """Hours, (K PER_DRAW,): of a probe whose latents are its group's means."""
    latents, parameters = typical_latents(part, coating, waveform)
    hours = part.layout.shape.half_life_hours(latents, parameters)
    return np.asarray(np.broadcast_to(hours, latents.shape[:-1])).ravel()


def typical_latents(part: Component, coating: str, waveform: str) -> tuple[Floats, Floats]:
    """Draws of a group's mean latents (K, PER_DRAW, q), and of the shape's parameters (K, 1, p)."""
    names = part.effects.names
    n_latents = len(part.layout.shape.latents)
    rows = np.full((1, n_latents, 3), len(names))
    for k in range(n_latents):
        rows[0, k, 0] = names.index(("latent", str(k)))
    for slot, own in enumerate((("rate", "coating", coating), ("rate", "waveform", waveform)), start=1):
        if own in names:
            rows[0, 0, slot] = names.index(own)
    spread = np.linalg.cholesky(between(part.covariance, rows, rows)[0] + 1e-12 * np.eye(n_latents))
    noise = normal_points(PER_DRAW, max(n_latents, 1))[:, :n_latents] @ spread.T
    padded = np.append(part.mean_draws, np.zeros((len(part.mean_draws), 1)), axis=1)
    latents = padded[:, rows[0]].sum(axis=-1)[:, None, :] + noise
    return latents, read_scales(part.layout, part.theta_draws).shape[:, None, :]


def setting(events: Events, fitted: list[Fitted], which: int) -> dict[str, Any]:
    mine = (events.kind == EXPOSURE) & (events.which == which)
    draws = np.concatenate([read_scales(one.part.layout, one.part.theta_draws).weight[:, which] for one in fitted])
    return {
        "setting": events.settings[which],
        "is_reference": events.settings[which] == IN_VIVO,
        **interval(draws),
        "n_exposures": int(mine.sum()),
        "hours": float(events.amount[mine].sum()),
        "n_probes": len(np.unique(events.unit[mine])),
    }


def renewal(events: Events, fitted: list[Fitted], which: int) -> dict[str, Any]:
    mine = (events.kind == RENEWAL) & (events.which == which)
    draws = np.concatenate([read_scales(one.part.layout, one.part.theta_draws).recovery[:, which] for one in fitted])
    return {
        "method": events.renewals[which],
        **interval(draws),
        "n_renewals": int(mine.sum()),
        "n_probes": len(np.unique(events.unit[mine])),
    }


def days(events: Events, fitted: list[Fitted]) -> list[dict[str, Any]]:
    """Effects in log sensitivity: 0.1 is a day on which everything read 10 % too high."""
    counts = np.bincount(events.which[events.kind == READING], minlength=len(events.days))
    weight = np.array([one.part.weight for one in fitted])
    place = np.flatnonzero(fitted[0].problem.effects.is_day)
    at = [np.flatnonzero(one.problem.effects.is_day) for one in fitted]
    mean = sum(w * one.part.mean[p] for w, one, p in zip(weight, fitted, at, strict=True))
    variance = sum(w * variances(one.part.covariance)[p] for w, one, p in zip(weight, fitted, at, strict=True))
    bad = sum(w * one.outcome.bad_day for w, one in zip(weight, fitted, strict=True))
    rows = []
    for k, column in enumerate(place):
        name = fitted[0].problem.effects.names[column][1]
        effect, sd, chance = (
            float(np.asarray(mean)[k]),
            float(np.sqrt(np.asarray(variance)[k])),
            float(np.asarray(bad)[k]),
        )
        rows.append(
            {
                "day": name,
                "effect": effect,
                "sd": sd,
                "n_calibrations": int(counts[events.days.index(name)]),
                "bad_probability": chance,
                "suspicious": chance > SUSPICIOUS,
            }
        )
    return rows


def slips(events: Events, fitted: list[Fitted]) -> list[dict[str, Any]]:
    """Readings that look like a slip: unit, which of its readings (0 the first), and how probable."""
    read = events.unit[events.kind == READING]
    chance = np.zeros(len(read))
    for one in fitted:
        chance += one.part.weight * slip_probability(one, len(read))
    first = np.searchsorted(read, read, side="left")
    named = np.flatnonzero(chance > SUSPICIOUS)
    return [
        {"unit": events.units[read[k]], "reading": int(k - first[k]), "probability": float(chance[k])} for k in named
    ]


def slip_probability(one: Fitted, n_readings: int) -> Floats:
    chance = np.zeros(n_readings)
    for batch, seen in zip(one.problem.batches, one.outcome.units, strict=True):
        chance[batch.reading[batch.real]] = seen.slipped[batch.real]
    return chance


def damaged(events: Events, fitted: list[Fitted]) -> list[dict[str, Any]]:
    """Probes that look suddenly damaged rather than fouled, and before which reading (0 the first)."""
    chance: dict[int, Floats] = {}
    for one in fitted:
        for batch, seen in zip(one.problem.batches, one.outcome.units, strict=True):
            for unit, row in zip(batch.unit, seen.damaged, strict=True):
                chance[unit] = chance.get(unit, 0.0) + one.part.weight * row
    return [
        {"unit": events.units[unit], "before_reading": int(row.argmax()), "probability": float(row.sum())}
        for unit, row in sorted(chance.items())
        if row.sum() > SUSPICIOUS
    ]


def spreads(fitted: list[Fitted]) -> dict[str, dict[str, float | None]]:
    """Standard deviations in log sensitivity (levels, days, residual) and in log rate."""
    scales = [read_scales(one.part.layout, one.part.theta_draws) for one in fitted]
    found = {
        "level_between_probes": interval(np.concatenate([s.level_sd for s in scales])),
        "day": interval(np.concatenate([s.day_sd for s in scales])),
        "residual": interval(np.concatenate([s.residual_sd for s in scales])),
    }
    rates = [s.latent_sds[:, 0] for s in scales if s.latent_sds.shape[1]]
    return found | ({"log_rate_between_probes": interval(np.concatenate(rates))} if rates else {})
