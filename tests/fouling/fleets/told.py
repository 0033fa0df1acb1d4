"""The forecast under test, told the true shape and hyper-parameters: what is left to learn is each day and each probe.

No fit of these readings can be expected to do better, so the ratio of this one to the oracle, which is told the days as
well, is the part of the gap that is out of reach.
"""

from __future__ import annotations

import numpy as np

from electrolog.fouling.ascend import Peak, Width, log_posterior
from electrolog.fouling.cohort import fingerprint, keep, line_error_of, pose
from electrolog.fouling.events import READING, Events
from electrolog.fouling.fit import METHOD, CohortFit
from electrolog.fouling.propagation import Problem, start
from tests.fouling.fleets.generator import Array, Generator

NONE = 1e-3  # a standard deviation or odds of what the truth doesn't have
SWEEPS = 40


def told_fit(gen: Generator, events: Events) -> CohortFit | None:
    """None where the truth is none of the shapes."""
    if gen.first_step.sd > 0:
        return None
    problem = pose(events, gen.shape.name)
    theta = true_theta(gen, problem)
    state = start(problem, theta)
    value, _, outcome = log_posterior(problem, theta, state, SWEEPS, 1e-3)
    n = len(theta)
    sharp = Width(1e-12 * np.eye(n), np.zeros((len(problem.effects.names), n)), value)
    part = keep(problem, Peak(theta, value, state, outcome, True, sharp.covariance), sharp, 1.0)
    n_readings = int(np.sum(events.kind == READING))
    weights = {gen.shape.name: 1.0}
    seen = (fingerprint(events), line_error_of(events), weights, (part,), len(events.units), n_readings)
    return CohortFit(METHOD, *seen, True, (), {})


def true_theta(gen: Generator, problem: Problem) -> Array:
    layout, shape = problem.layout, gen.shape
    theta = np.array([prior.mean for prior in layout.priors])
    damage = gen.damage_share / float(np.mean(gen.reading_counts))
    theta[:7] = logs(
        gen.level.sd, gen.repeat_sd, gen.day_sd, gen.bad_day_sd or 0.4, gen.bad_day_share, gen.slip_share, damage
    )
    second = {"patch": gen.shape.log_exponent_sd}.get(shape.name, 0.0)
    theta[layout.latent_slots] = logs(gen.log_half_life.sd, second)[: len(layout.shape.latents)]
    theta[layout.group_slots] = logs(*(group_sd(gen, what, factor) for what, factor in layout.group_sds))
    weights = dict(zip(gen.settings, gen.setting_weights, strict=True))
    theta[layout.weight_slots] = logs(*(weights[name] for name in layout.free_settings))
    recovery = {renewal.name: renewal.recovery for renewal in gen.renewals}
    theta[layout.recovery_slots] = [logit(recovery[name]) for name in layout.renewals]
    known = {"plateau": [logit(shape.plateau)], "fast-then-slow": logs(shape.fast_times - 1.0)}
    theta[layout.shape_slots] = known.get(shape.name, [])
    return theta


def group_sd(gen: Generator, what: str, factor: str) -> float:
    if factor == "batch":
        return gen.batch_level_sd if what == "level" else gen.batch_log_half_life_sd
    return float(np.std(gen.coating_level if what == "level" else gen.coating_log_half_life))


def logs(*values: float) -> Array:
    return np.log(np.maximum(np.array(values, dtype=np.float64), NONE))


def logit(share: float) -> float:
    share = float(np.clip(share, NONE, 1.0 - NONE))
    return float(np.log(share / (1.0 - share)))
