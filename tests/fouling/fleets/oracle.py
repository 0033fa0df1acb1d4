"""The best forecast possible: importance sampling from the generating distribution, unit by unit.

It knows every hyper-parameter, every day's effect and every reading's error, but of a unit only its readings
(and that it didn't break). Given a unit's half-life and exponent, and the case (which readings slipped, which
run damaged it), the rest is linear and Gaussian and is integrated exactly. Half-life and exponent are drawn
from a fine grid of their posterior, spread evenly within its cells, and weighted back to the exact density.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from itertools import combinations, product

import numpy as np
from numpy.typing import NDArray

from electrolog.fouling.events import EXPOSURE, READING
from tests.fouling.fleets.families import stream
from tests.fouling.fleets.generator import LN10, Array, Gaussian, Generator
from tests.fouling.fleets.simulate import AHEAD_H, Fleet, State, walk

REACH_SD = 5.0
PARTS = 5  # of a cell, each way


@dataclass(frozen=True)
class Forecast:
    """Weighted draws per unit, (U, D); NaN for units that aren't scored. `effective_draws` is (U,)."""

    now: Array
    ahead: Array
    weights: Array
    effective_draws: Array


@dataclass(frozen=True)
class _Sight:
    """What the oracle sees of one unit: its readings, less what it knows, and the state they were made in."""

    y: Array
    error_sd: Array
    clock_h: Array
    runs: NDArray[np.int64]
    run_clocks_h: Array
    end_clock_h: float
    end_log_area: float
    end_runs: int


@dataclass(frozen=True)
class _Case:
    """One way it may have been: y = design @ (level, first step, damage) + shift − loss + error."""

    design: Array
    now: Array
    ahead: Array
    shift: Array
    log_prior: float


def oracle(fleet: Fleet, n_draws: int = 1000) -> Forecast:
    rng = stream("oracle", fleet.truth.generator.family)
    state = walk(fleet.truth.generator, fleet.events)
    shape = (fleet.truth.scored.size, n_draws)
    now, ahead, weights = np.full(shape, np.nan), np.full(shape, np.nan), np.full(shape, np.nan)
    for unit in np.flatnonzero(fleet.truth.scored):
        now[unit], ahead[unit], weights[unit] = _unit_draws(fleet, state, int(unit), n_draws, rng)
    return Forecast(now, ahead, weights, 1 / np.sum(weights**2, axis=1))


def _unit_draws(
    fleet: Fleet, state: State, unit: int, n_draws: int, rng: np.random.Generator
) -> tuple[Array, Array, Array]:
    gen = fleet.truth.generator
    sight = _sight(fleet, state, unit)
    cases = _cases(gen, sight)
    priors = (
        Gaussian(float(fleet.truth.units.log_half_life_mean[unit]), gen.log_half_life.sd),
        Gaussian(gen.shape.log_exponent_mean, gen.shape.log_exponent_sd),
    )
    coefficients = _coefficients(gen, float(fleet.truth.units.level_mean[unit]))

    def log_likelihoods(hidden: tuple[Array, Array]) -> Array:
        loss = gen.shape.loss(sight.clock_h, hidden[0][:, None], hidden[1][:, None])
        parts = [_log_marginal(case, sight, coefficients, loss) for case in cases]
        return np.stack(parts, axis=1) + _log_survival(gen, sight, hidden)[:, None]

    hidden, log_weight = _spread_draws(priors, log_likelihoods, n_draws, rng)
    by_case = log_likelihoods(hidden)
    weights = _normalised(log_weight + _log_sum(by_case))
    chosen = _choose(by_case, rng)
    now, ahead = np.empty(n_draws), np.empty(n_draws)
    z = rng.standard_normal(n_draws)
    for c in np.unique(chosen):
        these = chosen == c
        picked = (hidden[0][these], hidden[1][these])
        now[these], ahead[these] = _conditional(gen, cases[c], sight, coefficients, picked, z[these])
    return now, ahead, weights


def _sight(fleet: Fleet, state: State, unit: int) -> _Sight:
    events, truth = fleet.events, fleet.truth
    rows = np.flatnonzero(events.unit == unit)
    at = rows[events.kind[rows] == READING]
    ran = rows[events.kind[rows] == EXPOSURE]
    return _Sight(
        y=events.amount[at] - truth.day_effect[events.which[at]] - state.log_area[at],
        error_sd=truth.error_sd[at],
        clock_h=state.clock_h[at],
        runs=state.runs[at],
        run_clocks_h=state.clock_h[ran],
        end_clock_h=float(state.clock_h[rows[-1]]),
        end_log_area=float(state.log_area[rows[-1]]),
        end_runs=int(state.runs[rows[-1]]),
    )


def _cases(gen: Generator, sight: _Sight) -> list[_Case]:
    cases = []
    for run, log_p_damage in _damages(gen, sight.end_runs):
        damaged = (sight.runs >= run) & (run > 0)
        design = np.column_stack([np.ones(sight.y.size), -1.0 * (sight.runs > 0), -1.0 * damaged])
        now = np.array([1.0, -float(sight.end_runs > 0), -float(run > 0)])
        ahead = np.array([1.0, -1.0, -float(run > 0)])
        for shift, log_p_slip in _slips(gen, sight.y.size):
            cases.append(_Case(design, now, ahead, shift, log_p_damage + log_p_slip))
    return cases


def _damages(gen: Generator, n_runs: int) -> list[tuple[int, float]]:
    if gen.damage_share == 0 or n_runs == 0:
        return [(0, 0.0)]
    never = [(0, float(np.log1p(-gen.damage_share)))]
    return never + [(run, float(np.log(gen.damage_share / n_runs))) for run in range(1, n_runs + 1)]


def _slips(gen: Generator, n: int) -> list[tuple[Array, float]]:
    if gen.slip_share == 0:
        return [(np.zeros(n), 0.0)]
    found = []
    for count in range(min(n, 2) + 1):
        log_p = count * np.log(gen.slip_share / 2) + (n - count) * np.log1p(-gen.slip_share)
        for where in combinations(range(n), count):
            for signs in product((-LN10, LN10), repeat=count):
                shift = np.zeros(n)
                shift[list(where)] = signs
                found.append((shift, float(log_p)))
    return found


def _coefficients(gen: Generator, level_mean: float) -> tuple[Array, Array]:
    each = (Gaussian(level_mean, gen.level.sd), gen.first_step, gen.damage)
    return np.array([g.mean for g in each]), np.array([g.sd**2 for g in each])


def _log_marginal(case: _Case, sight: _Sight, coefficients: tuple[Array, Array], loss: Array) -> Array:
    mean, variance = coefficients
    residual = sight.y - case.shift + loss - case.design @ mean
    covariance = (case.design * variance) @ case.design.T + np.diag(sight.error_sd**2)
    factor = np.linalg.cholesky(covariance)
    white = np.linalg.solve(factor, residual.T)
    constant = np.log(np.diag(factor)).sum() + sight.y.size * np.log(2 * np.pi) / 2
    return np.asarray(case.log_prior - constant - np.sum(white**2, axis=0) / 2)


def _conditional(
    gen: Generator,
    case: _Case,
    sight: _Sight,
    coefficients: tuple[Array, Array],
    hidden: tuple[Array, Array],
    z: Array,
) -> tuple[Array, Array]:
    """Draws of the log sensitivity at the end of the events and AHEAD_H later, given half-life and case."""
    mean, variance = coefficients
    loss = gen.shape.loss(sight.clock_h, hidden[0][:, None], hidden[1][:, None])
    residual = sight.y - case.shift + loss - case.design @ mean
    covariance = (case.design * variance) @ case.design.T + np.diag(sight.error_sd**2)
    gain = np.linalg.solve(covariance, case.design * variance).T
    posterior_mean = mean + residual @ gain.T
    posterior_covariance = np.diag(variance) - gain @ (case.design * variance)

    def at(target: Array, clock_h: float) -> Array:
        sd = np.sqrt(max(0.0, float(target @ posterior_covariance @ target)))
        fouled = gen.shape.loss(np.array(clock_h), hidden[0], hidden[1])
        return np.asarray(posterior_mean @ target + sd * z - fouled + sight.end_log_area)

    return at(case.now, sight.end_clock_h), at(case.ahead, sight.end_clock_h + AHEAD_H)


def _log_survival(gen: Generator, sight: _Sight, hidden: tuple[Array, Array]) -> Array:
    loss = gen.shape.loss(sight.run_clocks_h, hidden[0][:, None], hidden[1][:, None])
    return np.asarray(np.sum(gen.log_survival(loss), axis=1))


def _spread_draws(
    priors: tuple[Gaussian, Gaussian],
    log_likelihoods: Callable[[tuple[Array, Array]], Array],
    n_draws: int,
    rng: np.random.Generator,
) -> tuple[tuple[Array, Array], Array]:
    """Draws of the two hidden numbers and their log(prior / proposal)."""

    def log_posterior(at: tuple[Array, Array]) -> Array:
        return _log_density(priors[0], at[0]) + _log_density(priors[1], at[1]) + _log_sum(log_likelihoods(at))

    axes = [_centres(priors[0], 151 if priors[1].sd else 301), _centres(priors[1], 61 if priors[1].sd else 1)]
    widths = [axis[1] - axis[0] if axis.size > 1 else 0.0 for axis in axes]
    first, second = (grid.ravel() for grid in np.meshgrid(*axes, indexing="ij"))
    near = _blurred(_normalised(log_posterior((first, second))), [axis.size for axis in axes])
    kept = near > 1e-7
    steps = [(np.arange(PARTS) - (PARTS - 1) / 2) / PARTS * width for width in widths]
    within = [grid.ravel() for grid in np.meshgrid(*steps, indexing="ij")]
    finer = tuple((g[kept][:, None] + w).ravel() for g, w in zip((first, second), within, strict=True))
    # a tenth goes by the coarse cells: where a cell is steep, its own height misleads
    proposal = 0.9 * _normalised(log_posterior((finer[0], finer[1])))
    proposal += 0.1 * np.repeat(near[kept] / near[kept].sum(), PARTS**2) / PARTS**2
    ranks = (np.arange(n_draws) + rng.random(n_draws)) / n_draws
    cell = np.minimum(np.searchsorted(np.cumsum(proposal), ranks), proposal.size - 1)
    x, z = (g[cell] + w / PARTS * (rng.random(n_draws) - 0.5) for g, w in zip(finer, widths, strict=True))
    return (x, z), _log_density(priors[0], x) + _log_density(priors[1], z) - np.log(proposal[cell])


def _centres(prior: Gaussian, n: int) -> Array:
    if n == 1:
        return np.array([prior.mean])
    edges = np.linspace(-REACH_SD, REACH_SD, n + 1)
    return prior.mean + prior.sd * (edges[1:] + edges[:-1]) / 2


def _blurred(p: Array, shape: list[int]) -> Array:
    table = p.reshape(shape)
    for axis in (0, 1):
        if table.shape[axis] > 1:
            table = (np.roll(table, 1, axis) + 2 * table + np.roll(table, -1, axis)) / 4
    return table.ravel()


def _log_density(prior: Gaussian, x: Array) -> Array:
    return np.zeros_like(x) if prior.sd == 0 else -(((x - prior.mean) / prior.sd) ** 2) / 2


def _log_sum(by_case: Array) -> Array:
    top = by_case.max(axis=1)
    return np.asarray(top + np.log(np.exp(by_case - top[:, None]).sum(axis=1)))


def _normalised(log_weight: Array) -> Array:
    weight = np.exp(log_weight - log_weight.max())
    return np.asarray(weight / weight.sum())


def _choose(by_case: Array, rng: np.random.Generator) -> NDArray[np.int64]:
    p = np.exp(by_case - by_case.max(axis=1, keepdims=True))
    steps = np.cumsum(p, axis=1) / p.sum(axis=1, keepdims=True)
    return np.asarray(np.sum(rng.random(len(p))[:, None] > steps[:, :-1], axis=1))
