"""The cohort engine beside references: lme4 where everything is Gaussian, brute force where the loss is curved.

With a straight line for the shape of loss and flat priors the engine is a linear mixed model, and its evidence is the
REML criterion: it has to equal lme4 at lme4's own variance components, and be flat there.
"""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from scipy.stats import multivariate_normal, norm

from electrolog.fouling import quadrature
from electrolog.fouling.batches import make_batches
from electrolog.fouling.effects import lay_out_effects, layout_for
from electrolog.fouling.events import EXPOSURE, READING, Events
from electrolog.fouling.line_error import LineError
from electrolog.fouling.propagation import Outcome, Problem, State, settle, start
from electrolog.fouling.quadrature import standard_nodes
from electrolog.fouling.shapes import SHAPES
from electrolog.fouling.shapes.shape import Loss, Prior, Shape
from electrolog.fouling.shared import plan_assembly
from tests.fouling.test_mixed import RESULTS, codes, numbers, sd_of, table

NEVER = -40.0  # log odds of what the reference model doesn't know: slips, damage, bad days
FLAT = 1e8  # variance of a prior that says nothing
GONE = -9.0  # log sd of a random effect that the reference model doesn't have


class StraightLine:
    """Loss falls with a slope that may have either sign: y = level + latent * hours."""

    name = "straight line"
    formula = "loss = -b E"
    latents: tuple[Prior, ...] = (Prior("slope", 0.0, 1.0),)
    latent_sds: tuple[Prior, ...] = (Prior("log sd of slope", 0.0, 1.0),)
    parameters: tuple[Prior, ...] = ()

    def loss(self, hours, latents, parameters):
        slope = latents[..., 0]
        value = -slope * hours
        return Loss(value, np.broadcast_to(-slope, value.shape), ())

    def half_life_hours(self, latents, parameters):
        raise NotImplementedError


def events_of(unit: np.ndarray, hours: np.ndarray, y: np.ndarray, day: np.ndarray) -> Events:
    """Each reading follows an exposure that brings the unit's hours to `hours`."""
    order = np.lexsort((hours, unit))
    unit, hours, y, day = unit[order], hours[order], y[order], day[order]
    before = np.where(np.r_[True, unit[1:] != unit[:-1]], 0.0, np.r_[0.0, hours[:-1]])
    n = len(y)
    pair = lambda first, second: np.column_stack([first, second]).ravel()  # noqa: E731
    return Events(
        unit=np.repeat(unit, 2),
        kind=pair(np.full(n, EXPOSURE), np.full(n, READING)).astype(np.int8),
        which=pair(np.zeros(n, dtype=np.int64), day),
        amount=pair(hours - before, y),
        se=np.full(2 * n, np.nan),
        units=tuple(f"unit {u}" for u in range(unit.max() + 1)),
        settings=("in-vivo",),
        renewals=(),
        days=tuple(f"day {d}" for d in range(day.max() + 1)),
        groups={},
    )


def problem_of(events: Events, shape: Shape, flat: bool) -> Problem:
    layout = layout_for(shape, events)
    effects = lay_out_effects(shape, layout.group_sds, events)
    if flat:
        effects = replace(
            effects,
            fixed_variance=np.where(effects.is_day, np.inf, FLAT),
            prior_mean=np.zeros_like(effects.prior_mean),
            variance_slot=np.where(effects.is_day, -2, effects.variance_slot),
        )
    batches = make_batches(events, effects, len(shape.latents), LineError(0.0, 1.0))
    return Problem(events, layout, effects, batches, plan_assembly([b.columns for b in batches], len(effects.names)))


def theta_of(
    problem: Problem, *, level: float, residual: float, day: float, latents: tuple[float, ...] = ()
) -> np.ndarray:
    """Logs of the standard deviations; whatever else could happen never does."""
    theta = np.array([prior.mean for prior in problem.layout.priors])
    theta[:7] = [level, residual, day, 0.0, NEVER, NEVER, NEVER]
    theta[problem.layout.latent_slots] = latents
    return theta


def settled(problem: Problem, theta: np.ndarray) -> tuple[State, Outcome]:
    state = start(problem, theta)
    for _ in range(6):
        outcome = settle(problem, theta, state, 60, 1e-12)
    return state, outcome


def log_flat_prior(count: int) -> float:
    """REML integrates fixed effects over an even measure; the engine over N(0, FLAT)."""
    return 0.5 * count * np.log(2.0 * np.pi * FLAT)


def component(wanted: dict, group: str) -> float:
    return float(np.log(sd_of(wanted, group)))


@pytest.fixture
def fine_grid(monkeypatch):
    """The shipped grid is good to two parts in 100,000; five digits need nodes closer together."""
    monkeypatch.setattr(quadrature, "SPACING", {1: (0.4, 0.4)})
    monkeypatch.setattr(quadrature, "REACH", 5.0)
    standard_nodes.cache_clear()
    yield
    standard_nodes.cache_clear()


class TestBesideLme4:
    """R 4.2.2, lme4 1.1-31; REML."""

    @pytest.mark.usefixtures("fine_grid")
    def test_level_and_slope_between_subjects(self):
        data, wanted = table("sleepstudy"), RESULTS["sleepstudy_uncorr"]["REML"]
        who, day0 = codes(data["Subject"]), np.zeros(len(data["Days"]), dtype=np.int64)
        events = events_of(who, numbers(data, "Days"), numbers(data, "Reaction"), day0)
        problem = problem_of(events, StraightLine(), flat=True)
        level, slope = (r["sdcor"] for r in wanted["varcomp"] if r["grp"] != "Residual")
        theta = theta_of(
            problem, level=np.log(level), residual=component(wanted, "Residual"), day=GONE, latents=(np.log(slope),)
        )
        state, outcome = settled(problem, theta)
        np.testing.assert_allclose(state.mean[:2], list(wanted["fixed"].values()), rtol=1e-5)
        np.testing.assert_allclose(np.sqrt(np.diag(state.covariance)[:2]), list(wanted["se"].values()), rtol=1e-5)
        assert outcome.log_evidence + log_flat_prior(2) == pytest.approx(wanted["logLik"], abs=2e-3)
        assert np.abs(outcome.score[[0, 1, 7]]).max() < 2e-3  # lme4's optimum is the engine's too

    def test_crossed_samples_and_plates(self):
        data, wanted = table("Penicillin"), RESULTS["Penicillin_crossed"]["REML"]
        plate, sample = codes(data["plate"]), codes(data["sample"])
        events = events_of(plate, np.zeros(len(plate)), numbers(data, "diameter"), sample)
        problem = problem_of(events, SHAPES["none"], flat=True)
        theta = theta_of(
            problem,
            level=component(wanted, "plate"),
            residual=component(wanted, "Residual"),
            day=component(wanted, "sample"),
        )
        state, outcome = settled(problem, theta)
        assert state.mean[0] == pytest.approx(wanted["fixed"]["(Intercept)"], rel=1e-6)
        assert np.sqrt(state.covariance[0, 0]) == pytest.approx(wanted["se"]["(Intercept)"], rel=1e-5)
        assert outcome.log_evidence + log_flat_prior(1) == pytest.approx(wanted["logLik"], abs=1e-4)
        predicted = [row["(Intercept)"] for row in wanted["blup"]["sample"]]
        np.testing.assert_allclose(state.mean[1:7], predicted, rtol=1e-5, atol=1e-6)
        assert np.abs(outcome.score[:3]).max() < 2e-3


def small_cohort(rng: np.random.Generator, n_units: int, n_days: int) -> Events:
    unit = np.repeat(np.arange(n_units), 3)
    hours = np.cumsum(rng.uniform(1.0, 6.0, (n_units, 3)), axis=1).ravel()
    rate = np.exp(rng.normal(-2.5, 0.5, n_units))[unit]
    day = rng.integers(n_days, size=len(unit))
    effect = rng.normal(0.0, 0.1, n_days)
    level = rng.normal(2.0, 0.4, n_units)[unit]
    y = level - rate * hours + effect[day] + rng.normal(0.0, 0.05, len(unit))
    return events_of(unit, hours, y, day)


class TestBesideBruteForce:
    @pytest.mark.parametrize("name", ["exponential", "plateau", "square-root", "patch", "fast-then-slow"])
    def test_a_units_evidence_is_the_integral(self, name):
        """Every unit alone, the shared effects known: an even grid of 4,001 (or 401 x 401) latents does the integral.

        Nats: the engine's 100 nodes or so are stretched, and good to some thousandths where there are two latents.
        """
        events = small_cohort(np.random.default_rng(3), 4, 1)
        problem = problem_of(events, SHAPES[name], flat=False)
        sds = (-0.7, -1.2)[: len(SHAPES[name].latents)]
        theta = theta_of(problem, level=-0.9, residual=-3.0, day=GONE, latents=sds)
        known = replace(problem.effects, fixed_variance=np.where(problem.effects.is_day, np.inf, 1e-16))
        problem = replace(problem, effects=known)
        _, outcome = settled(problem, theta)
        found = np.concatenate([seen.log_evidence for seen in outcome.units])
        wanted = [brute_force(events, unit, problem, theta) for unit in range(4)]
        np.testing.assert_allclose(found, wanted, rtol=0, atol=2e-4 if len(sds) == 1 else 3e-3)

    def test_shared_effects_are_the_posterior_of_many_draws(self):
        """Ten units, three days; the hyper-parameters held. Rao-Blackwell importance sampling over rate mean and rates:
        given the units' rates all else is Gaussian, so that each draw integrates level mean, levels and days
        exactly."""
        rng = np.random.default_rng(5)
        events = small_cohort(rng, 10, 3)
        problem = problem_of(events, SHAPES["exponential"], flat=False)
        theta = theta_of(problem, level=-0.9, residual=-3.0, day=-2.3, latents=(-0.7,))
        state, outcome = settled(problem, theta)
        mean, sd, log_evidence = importance_sampled(events, problem, theta, outcome, rng)
        np.testing.assert_allclose(state.mean[[0, 2, 3, 4]], mean, atol=0.01)
        np.testing.assert_allclose(np.sqrt(np.diag(state.covariance))[[0, 2, 3, 4]], sd, rtol=0.05)
        assert outcome.log_evidence == pytest.approx(log_evidence, abs=0.1)


def brute_force(events: Events, unit: int, problem: Problem, theta: np.ndarray) -> float:
    read = (events.kind == READING) & (events.unit == unit)
    hours = np.cumsum(np.where(events.kind == EXPOSURE, events.amount, 0.0)[events.unit == unit])
    hours = hours[events.kind[events.unit == unit] == READING]
    shape = problem.layout.shape
    count = 4001 if len(shape.latents) == 1 else 401
    axes = [
        prior.mean + np.exp(t) * np.linspace(-9, 9, count)
        for prior, t in zip(shape.latents, theta[problem.layout.latent_slots], strict=True)
    ]
    grid = np.stack(np.meshgrid(*axes, indexing="ij"), axis=-1).reshape(-1, len(axes))
    loss = shape.loss(hours[None, :], grid[:, None, :], theta[problem.layout.shape_slots]).value
    covariance = np.exp(2 * theta[0]) + np.exp(2 * theta[1]) * np.eye(len(hours))
    expected = problem.effects.prior_mean[0]
    log_likelihood = multivariate_normal(np.zeros(len(hours)), covariance).logpdf(events.amount[read] + loss - expected)
    log_prior = sum(
        norm(prior.mean, np.exp(t)).logpdf(grid[:, k])
        for k, (prior, t) in enumerate(zip(shape.latents, theta[problem.layout.latent_slots], strict=True))
    )
    cell = np.prod([axis[1] - axis[0] for axis in axes])
    return float(np.log(np.sum(np.exp(log_likelihood + log_prior)) * cell))


def importance_sampled(events, problem, theta, outcome, rng, count=100_000):
    """Posterior mean and sd of level mean and days, and log evidence; proposals near each unit's own posterior."""
    read = events.kind == READING
    unit, day, y = events.unit[read], events.which[read], events.amount[read]
    hours = np.concatenate(
        [np.cumsum(events.amount[(events.unit == u) & (events.kind == EXPOSURE)]) for u in range(10)]
    )
    level, residual, day_sd, rate_sd = np.exp(theta[[0, 1, 2, 7]])
    design = np.column_stack([np.ones(len(y)), day[:, None] == np.arange(3)]).astype(float)
    prior = np.array([problem.effects.fixed_variance[0], *[day_sd**2] * 3])
    noise = level**2 * (unit[:, None] == unit) + residual**2 * np.eye(len(y))
    marginal = noise + (design * prior) @ design.T
    gain = np.linalg.solve(marginal, design * prior).T
    leftover = np.diag(prior) - gain @ design * prior
    centre, spread = posterior_of_rates(problem, outcome)
    t = 5.0
    rates = centre + 1.3 * spread * rng.standard_t(t, (count, 10))
    log_q = np.sum(t_logpdf((rates - centre) / (1.3 * spread), t) - np.log(1.3 * spread), axis=1)
    m0, v0 = problem.effects.prior_mean[1], problem.effects.fixed_variance[1]
    log_prior = multivariate_normal(np.full(10, m0), rate_sd**2 * np.eye(10) + v0).logpdf(rates)
    off = y + np.exp(rates)[:, unit] * hours - problem.effects.prior_mean[0]
    log_w = log_prior + multivariate_normal(np.zeros(len(y)), marginal).logpdf(off) - log_q
    w = np.exp(log_w - log_w.max())
    assert w.sum() ** 2 / np.sum(w**2) > 2000  # enough draws count
    means = off @ gain.T + np.array([problem.effects.prior_mean[0], 0, 0, 0])
    mean = w @ means / w.sum()
    variance = np.diag(leftover) + w @ (means - mean) ** 2 / w.sum()
    return mean, np.sqrt(variance), float(log_w.max() + np.log(w.mean()))


def t_logpdf(x: np.ndarray, df: float) -> np.ndarray:
    from scipy.stats import t

    return t(df).logpdf(x)


def posterior_of_rates(problem, outcome):
    centre, spread = np.zeros(10), np.zeros(10)
    for batch, seen in zip(problem.batches, outcome.units, strict=True):
        centre[batch.unit] = seen.latent_mean[:, 0]
        spread[batch.unit] = np.sqrt(seen.latent_variance[:, 0])
    return centre, spread
