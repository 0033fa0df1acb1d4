"""The most probable hyper-parameters of one shape, how sharply the data hold them, and the shape's evidence."""

from __future__ import annotations

from copy import deepcopy
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from electrolog.fouling.propagation import Outcome, Problem, State, settle, start

Floats = NDArray[np.float64]
ROUNDS = (8, 25, 25)  # steps before the coordinates are renewed
FLAT = 0.15  # steepest slope left, per standard deviation: moves the peak by less than that part of one
OUT_OF_REACH = 1e12
STEP = 0.15  # of a standard deviation, for second derivatives by differences


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


def log_posterior(problem: Problem, theta: Floats, state: State, sweeps: int = 6) -> tuple[float, Floats, Outcome]:
    mean, sd = prior_of(problem)
    outcome = settle(problem, theta, state, sweeps)
    off = (theta - mean) / sd
    log_prior = -0.5 * float(off @ off) - float(np.log(sd).sum()) - 0.5 * len(sd) * float(np.log(2.0 * np.pi))
    return outcome.log_evidence + log_prior, outcome.score - off / sd, outcome


def climb(problem: Problem, theta: Floats, hopeless_below: float = -np.inf) -> Peak:
    """BFGS in coordinates in which the outer product of the units' scores (Berndt et al. 1974) is the identity.

    Gives up, unconverged, once a first round of steps leaves it below `hopeless_below`: a shape that far behind another
    has no weight, however well its own peak is found.
    """
    peak = first_look(problem, theta)
    for most_steps in ROUNDS:
        peak = best_nearby(problem, peak, most_steps)
        if peak.converged or peak.log_posterior < hopeless_below:
            break
    return peak


def first_look(problem: Problem, theta: Floats) -> Peak:
    state = start(problem, theta)
    value, _, outcome = log_posterior(problem, theta, state, 15)
    return Peak(theta, value, state, outcome, False, rough_covariance(problem, outcome))


def best_nearby(problem: Problem, peak: Peak, most_steps: int) -> Peak:
    from scipy.optimize import minimize

    root = np.linalg.cholesky(peak.rough_covariance)
    best, state = peak, deepcopy(peak.state)

    def downhill(x: Floats) -> tuple[float, Floats]:
        nonlocal best, state
        theta = peak.theta + root @ x
        try:
            value, slope, outcome = log_posterior(problem, theta, state)
        except np.linalg.LinAlgError:  # a step too far: the line search will come back
            state = deepcopy(best.state)
            return OUT_OF_REACH, np.zeros(len(x))
        if value > best.log_posterior:
            best = Peak(theta, value, deepcopy(state), outcome, False, peak.rough_covariance)
        return -value, -(root.T @ slope)

    minimize(downhill, np.zeros(len(root)), jac=True, method="BFGS", options={"maxiter": most_steps, "gtol": 0.05})
    state = deepcopy(best.state)
    value, slope, outcome = log_posterior(problem, best.theta, state)
    rough = rough_covariance(problem, outcome)
    steepest = float(np.max(np.abs(np.linalg.cholesky(rough).T @ slope)))
    return Peak(best.theta, value, state, outcome, steepest < FLAT, rough)


def rough_covariance(problem: Problem, outcome: Outcome) -> Floats:
    sd = prior_of(problem)[1]
    scores = outcome.unit_scores - outcome.unit_scores.mean(axis=0)
    information = scores.T @ scores + np.diag(1.0 / sd**2)
    information[2, 2] += 0.5 * np.sum(problem.effects.is_day)
    for g in range(len(problem.layout.group_sds)):
        slot = problem.layout.group_slots.start + g
        information[slot, slot] += 0.5 * np.sum(problem.effects.variance_slot == g)
    covariance = np.linalg.inv(information)
    return 0.5 * (covariance + covariance.T)


def widths(problem: Problem, peak: Peak) -> Width:
    n = len(peak.theta)
    sd = np.sqrt(np.diag(peak.rough_covariance))
    base_state = deepcopy(peak.state)
    base = log_posterior(problem, peak.theta, base_state, 8)[1]
    hessian, moved = np.zeros((n, n)), np.zeros((len(base_state.mean) - 1, n))
    for k in range(n):
        theta, state = peak.theta.copy(), deepcopy(base_state)
        theta[k] += STEP * sd[k]
        slope = log_posterior(problem, theta, state, 8)[1]
        hessian[:, k] = (base - slope) / (STEP * sd[k])
        moved[:, k] = (state.mean - base_state.mean)[:-1] / (STEP * sd[k])
    values, vectors = np.linalg.eigh(0.5 * (hessian + hessian.T))
    least = 1.0 / np.max(prior_of(problem)[1]) ** 2
    values = np.maximum(values, 0.5 * least)
    covariance = (vectors / values) @ vectors.T
    log_evidence = peak.log_posterior + 0.5 * n * np.log(2.0 * np.pi) - 0.5 * float(np.log(values).sum())
    return Width(covariance, moved, log_evidence)


def rough_width(problem: Problem, peak: Peak) -> Width:
    """For a shape given up: by the scores' outer product, and only good for saying that it has no weight."""
    n = len(peak.theta)
    log_det = np.linalg.slogdet(peak.rough_covariance)[1]
    log_evidence = peak.log_posterior + 0.5 * n * np.log(2.0 * np.pi) + 0.5 * float(log_det)
    return Width(peak.rough_covariance, np.zeros((len(problem.effects.names), n)), log_evidence)
