"""How long a probe will last, and how many to make for the runs that are planned."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from electrolog.errors import InputError
from electrolog.judge import odds
from electrolog.judge.facts import noise_of
from electrolog.judge.question import Question

Array = NDArray[np.float64]

HORIZON_MIN = 1000 * 60.0  # run time; beyond it a forecast is an extrapolation that no lab has seen
STEPS = 80
ENOUGH = 0.9  # odds that the number to make is enough
MOST_MADE = 5000


@dataclass(frozen=True)
class Life:
    """Run minutes from now. None: not within HORIZON_MIN.

    accepted_min: when the odds of a breach pass the accepted risk. broken_min: the 5, 50 and 95 % quantiles of when
    the first limit really breaks; 0 is already now.
    """

    accepted_min: float | None
    broken_min: tuple[float | None, float | None, float | None]


def life(question: Question) -> Life | None:
    """None where the accepted risk or every limit at the run's end is unset, or one of them can't be told."""
    risk, broken_min = question.limits.accepted_risk(), breaking_times_min(question)
    if risk is None or broken_min is None:
        return None
    low, middle, high = (_within(value) for value in np.quantile(broken_min, odds.QUANTILES, method="lower"))
    accepted = float(np.quantile(broken_min, risk.value, method="lower"))
    return Life(_within(accepted), (low, middle, high))


def _within(minutes: float) -> float | None:
    return float(minutes) if np.isfinite(minutes) else None


def breaking_times_min(question: Question) -> Array | None:
    """(D,) run minutes until each draw breaks its first limit; infinity beyond the horizon."""
    now = question.log_sensitivity_at(0.0)
    noise = noise_of(question.calibration) if question.calibration else None
    beside = odds.Beside(question.reference_log_sensitivity, noise.draws(len(now)) if noise else None)
    ends = odds.EndLimits.of(question.limits, question.needs_um)
    untold = len(odds.values_at(now, beside, ends)) < len(ends.by_rule)
    least = odds.least_log_sensitivity(beside, ends)
    return (
        None
        if least is None or untold
        else _crossing_min(question.log_sensitivity_at, np.broadcast_to(least, now.shape))
    )


def _crossing_min(log_sensitivity_at: Callable[[float], Array], least: Array) -> Array:
    """Steps that grow, because fouling is fast at first; linear within one."""
    grid = np.concatenate([[0.0], np.geomspace(5.0, HORIZON_MIN, STEPS)])
    spare = np.stack([log_sensitivity_at(float(minutes)) - least for minutes in grid])
    broken = spare < 0
    first = np.argmax(broken, axis=0)
    draws = np.arange(spare.shape[1])
    before = np.maximum(first - 1, 0)
    above, below = spare[before, draws], spare[first, draws]
    share = np.where(first > 0, above / np.where(above == below, 1.0, above - below), 0.0)
    crossing = grid[before] + share * (grid[first] - grid[before])
    return np.where(broken.any(axis=0), crossing, np.inf)


def runs_within(life_min: Array, run_min: float, uses_left: float = np.inf) -> Array:
    """How many whole runs of that length fit into each life."""
    return np.asarray(np.minimum(np.floor(life_min / run_min), uses_left))


@dataclass(frozen=True)
class ToMake:
    """likely: enough in half of the cases; enough: in nine of ten; None: more than MOST_MADE.

    yield_share: 5, 50 and 95 % quantiles of the share of made probes that turn out usable, from the counts given.
    """

    likely: int | None
    enough: int | None
    runs_on_shelf: tuple[float, float, float]
    yield_share: tuple[float, float, float]
    said: str


def probes_to_make(planned_runs: int, runs_on_shelf: Array, runs_of_new: Array, *, good: int, made: int) -> ToMake:
    """How many to make so that the planned runs can all be served.

    runs_on_shelf: (P, D) whole runs that each probe of the shelf will serve, in D draws. runs_of_new: (N,) what usable
    new probes serve, equally likely. good of made probes were usable so far; nothing made yet (0 of 0) leaves the
    yield anywhere between nought and one. Raises InputError for counts that can't be.
    """
    if planned_runs < 0 or not 0 <= good <= made:
        raise InputError(f"{planned_runs} runs planned, {good} usable of {made} made: these counts can't be")
    rng = np.random.default_rng(1)  # fixed: the same question gets the same number
    served = runs_on_shelf.sum(axis=0) if runs_on_shelf.size else np.zeros(1)
    draws = max(len(served), 500)
    shelf = np.resize(served, draws)
    usable_share = _yield_draws(good, made, draws)
    counts = _counts(planned_runs - shelf, rng.permutation(usable_share), runs_of_new, rng)
    low, middle, high = (float(value) for value in np.quantile(usable_share, odds.QUANTILES))
    return ToMake(
        _count(np.quantile(counts, 0.5, method="higher")),
        _count(np.quantile(counts, ENOUGH, method="higher")),
        odds.spread(shelf),
        (low, middle, high),
        f"for {planned_runs} runs; yield from {good} usable of {made} made",
    )


def _yield_draws(good: int, made: int, draws: int) -> Array:
    """Jeffreys' posterior of a share (Brown, Cai & DasGupta, Statistical Science 16 (2001) 101)."""
    from scipy.special import betaincinv

    return np.asarray(betaincinv(good + 0.5, made - good + 0.5, (np.arange(draws) + 0.5) / draws), dtype=float)


def _counts(missing: Array, usable_share: Array, runs_of_new: Array, rng: np.random.Generator) -> Array:
    """Make probes one by one, in every draw, until its missing runs can be served."""
    counts, left = np.zeros(len(missing)), missing.astype(float)
    for _ in range(MOST_MADE):
        short = np.flatnonzero(left > 0)
        if not short.size:
            return counts
        counts[short] += 1
        usable = rng.random(short.size) < usable_share[short]
        left[short] -= usable * rng.choice(runs_of_new, short.size)
    return np.where(left > 0, np.inf, counts)


def _count(value: float) -> int | None:
    return int(value) if np.isfinite(value) else None
