"""The most probable hyper-parameters of one shape, how sharply the data hold them, and the shape's evidence."""

from __future__ import annotations

from copy import deepcopy
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from electrolog.fouling.parameters import COMMON
from electrolog.fouling.propagation import Outcome, Problem, State, settle, start

Floats = NDArray[np.float64]
MOST_STEPS = 60
FLAT = 0.02  # gain of log posterior (twice) that a last step would still bring
NOISE = 0.02  # in a log evidence whose stand-ins haven't quite settled
NEVER = -25.0  # log odds of slips and damage
STEP = 0.15  # of a standard deviation, for second derivatives by differences


@dataclass(frozen=True)
class Patience:
    """How exactly a peak is sought, and how long one that is far behind another."""

    slack: float  # times as much as otherwise may still be to gain where a climb ends
    settling: int  # sweeps, at most, before the first step
    look: int  # steps that every climb is given
    promise: float  # times what the last step gained and the next one promises: more is not expected


THOROUGH, ROUGH = Patience(1.0, 15, 8, 10.0), Patience(10.0, 6, 3, 3.0)


@dataclass(frozen=True)
class Peak:
    theta: Floats
    log_posterior: float
    state: State
    outcome: Outcome
    converged: bool
    rough_covariance: Floats


@dataclass(frozen=True)
class Width:
    """Laplace's approximation at a peak: covariance of theta, how the shared effects move with it, log evidence."""

    covariance: Floats  # (P, P)
    effects_per_theta: Floats  # (F, P)
    log_evidence: float


def prior_of(problem: Problem) -> tuple[Floats, Floats]:
    return (
        np.array([p.mean for p in problem.layout.priors]),
        np.array([p.sd for p in problem.layout.priors]),
    )


def crowd(problem: Problem) -> float:
    """Tolerances are for a cohort of some hundred units; a larger one's evidence is a larger number."""
    return max(1.0, len(problem.events.units) / 500.0)


def log_posterior(
    problem: Problem, theta: Floats, state: State, sweeps: int = 6, tolerance: float = 0.01
) -> tuple[float, Floats, Outcome]:
    mean, sd = prior_of(problem)
    outcome = settle(problem, theta, state, sweeps, tolerance * crowd(problem))
    off = (theta - mean) / sd
    log_prior = -0.5 * float(off @ off) - float(np.log(sd).sum()) - 0.5 * len(sd) * float(np.log(2.0 * np.pi))
    return outcome.log_evidence + log_prior, outcome.score - off / sd, outcome


def climb(problem: Problem, theta: Floats, hopeless_below: float = -np.inf, patience: Patience = THOROUGH) -> Peak:
    """Quasi-Newton ascent (BFGS), started from the outer product of the units' scores (Berndt et al. 1974).

    The stand-ins are carried from step to step, so most steps need two sweeps. Gives up, unconverged, once it
    promises to stay below `hopeless_below`: a shape that far behind another has no weight, however well its peak is
    found.
    """
    loose = patience.slack * crowd(problem)
    state = start(problem, theta)
    # First as if nothing went wrong with any unit: else a bad day may be taken for as many slips, and stay so.
    settle(problem, without_mishaps(theta), state, 6, 0.1 * loose)
    value, slope, outcome = log_posterior(problem, theta, state, patience.settling)
    inverse = rough_covariance(problem, outcome)
    best = Step(theta, value, slope, outcome, deepcopy(state))
    shrink, converged, gained = 1.0, False, np.inf
    for count in range(MOST_STEPS):
        step = capped(inverse @ best.slope) * shrink
        converged = bool(best.slope @ inverse @ best.slope < FLAT * loose)
        hopeless = best.value + patience.promise * min(gained, float(best.slope @ step)) < hopeless_below
        if converged or (count >= patience.look and hopeless):
            break
        found = try_step(problem, best, step)
        if found is None or found.value < best.value - NOISE * loose:
            if hopeless and np.isfinite(gained):
                break
            best = try_step(problem, best, 0.0 * step, 12) or best
        if found is None or found.value < best.value - NOISE * loose:
            shrink *= 0.35
            if shrink < 1e-3:
                break
            continue
        inverse = updated(inverse, found.theta - best.theta, best.slope - found.slope)
        gained = found.value - best.value
        best, shrink = found, min(1.0, shrink * 2.0)
    return Peak(best.theta, best.value, best.state, best.outcome, converged, rough_covariance(problem, best.outcome))


def without_mishaps(theta: Floats) -> Floats:
    cautious = theta.copy()
    cautious[5:COMMON] = NEVER
    return cautious


@dataclass(frozen=True)
class Step:
    theta: Floats
    value: float
    slope: Floats
    outcome: Outcome
    state: State


def try_step(problem: Problem, best: Step, step: Floats, sweeps: int = 4) -> Step | None:
    """None where a step went too far for the matrices to stay positive definite."""
    state = deepcopy(best.state)
    try:
        return Step(best.theta + step, *log_posterior(problem, best.theta + step, state, sweeps), state)
    except np.linalg.LinAlgError:
        return None


def capped(step: Floats) -> Floats:
    """Scales and odds are logarithms: nothing moves by more than two units at once."""
    return step / max(1.0, 0.5 * float(np.max(np.abs(step))))


def updated(inverse: Floats, moved: Floats, turned: Floats) -> Floats:
    """The BFGS update of the inverse curvature, left out where the slope didn't turn the right way."""
    product = float(moved @ turned)
    if product <= 1e-3 * float(np.sqrt((moved @ moved) * (turned @ turned))):
        return inverse
    left = np.eye(len(moved)) - np.outer(moved, turned) / product
    return np.asarray(left @ inverse @ left.T + np.outer(moved, moved) / product)


def rough_covariance(problem: Problem, outcome: Outcome) -> Floats:
    """From the outer product of the scores, where scores tell: of what hardly ever happens they don't, and there the
    information is what it would be with everything seen, the number of times that it happened (or ought to have)."""
    sd = prior_of(problem)[1]
    scores = outcome.unit_scores
    scores = scores - scores.sum(axis=0) / max(1, len(scores))
    information = scores.T @ scores
    information[2:5, 2:5] += outcome.day_information
    for slot, found in outcome.mishaps.items():
        information[slot, slot] = max(information[slot, slot], found, found - outcome.score[slot])
    information[problem.layout.group_slots, problem.layout.group_slots] += np.diag(outcome.group_information)
    covariance = np.linalg.inv(information + np.diag(1.0 / sd**2))
    return 0.5 * (covariance + covariance.T)


def widths(problem: Problem, peak: Peak) -> Width:
    """Differences of slopes. Grids stay where they are: one that moved would add its own jump to a small difference."""
    n = len(peak.theta)
    sd = np.sqrt(np.diag(peak.rough_covariance))
    base_state = deepcopy(peak.state)
    base_state.grids_stay = True
    base = log_posterior(problem, peak.theta, base_state, 15, 1e-4)[1]
    hessian, moved = np.zeros((n, n)), np.zeros((len(base_state.mean) - 1, n))
    for k in range(n):
        theta, state = peak.theta.copy(), deepcopy(base_state)
        theta[k] += STEP * sd[k]
        slope = log_posterior(problem, theta, state, 12, 1e-4)[1]
        hessian[:, k] = (base - slope) / (STEP * sd[k])
        moved[:, k] = (state.mean - base_state.mean)[:-1] / (STEP * sd[k])
    values, vectors = np.linalg.eigh(0.5 * (hessian + hessian.T))
    least = 1.0 / np.max(prior_of(problem)[1]) ** 2
    values = np.maximum(values, 0.5 * least)
    covariance = (vectors / values) @ vectors.T
    log_evidence = peak.log_posterior + 0.5 * n * np.log(2.0 * np.pi) - 0.5 * float(np.log(values).sum())
    return Width(covariance, moved, log_evidence)


def rough_width(problem: Problem, peak: Peak) -> Width:
    """By the scores' outer product: of very many units it is as good; of fewer, good for saying that a shape has no
    weight.
    """
    n = len(peak.theta)
    log_det = np.linalg.slogdet(peak.rough_covariance)[1]
    log_evidence = peak.log_posterior + 0.5 * n * np.log(2.0 * np.pi) + 0.5 * float(log_det)
    return Width(peak.rough_covariance, np.zeros((len(problem.effects.names), n)), log_evidence)
