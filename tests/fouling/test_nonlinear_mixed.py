"""The cohort engine beside nlme: curves whose parameters differ from subject to subject, by maximum likelihood.

Numbers: R 4.2.2, nlme 3.1-162, Lindstrom-Bates; some of its searches stop at the limit of step halving, so that four of
their digits count. Each data set's own source stands at the head of its CSV.

Where the random effect enters the curve linearly, nlme's log-likelihood at its estimates is exact, and the engine's has
to equal it there. Its estimates are not the likelihood's own maximum: it takes the fixed effects from penalised least
squares. The engine climbs on, a few hundredths of a nat. Where a random effect enters through an exponential nlme
linearises, and the engine integrates: held by brute force.

Not here, for the engine has no more than two latents a unit: Indometh (three and four random effects), Cefamandole
(four), CO2 with three correlated ones. Theoph with a random elimination rate is the model below: nlme itself puts that
variance at zero, as it does for DNase's midpoint.
"""

from __future__ import annotations

import json
from collections.abc import Callable, Iterator
from dataclasses import dataclass
from functools import cache

import numpy as np
import pytest
from scipy.optimize import minimize, root

from electrolog.fouling import quadrature
from electrolog.fouling.batches import make_batches
from electrolog.fouling.effects import Effects
from electrolog.fouling.line_error import LineError
from electrolog.fouling.propagation import Outcome, Problem, settle, start
from electrolog.fouling.quadrature import standard_nodes
from electrolog.fouling.shapes.shape import Loss, Prior
from electrolog.fouling.shared import plan_assembly
from tests.fouling.test_mixed import REFERENCE, numbers, table
from tests.fouling.test_propagation import brute_force, events_of, problem_of, theta_of

RESULTS = json.loads((REFERENCE / "nlmm_results.json").read_text(encoding="utf-8"))
LINEARISING_COSTS_NATS = {"DNase_ML_diag": 0.075, "Theoph_ML_lKa_lCl": -0.731, "CO2_ML_Asym_lrc": 0.045}
NO_LEVEL = -20.0  # log sd of a level between units: the reference models have none
STEP = 1e-6

Curve = Callable[..., np.ndarray]


class RowByRow:
    """Any curve as a shape of loss: hours are row numbers, so that a curve may see several covariates."""

    name = "curve"
    formula = "loss = -curve"

    def __init__(self, curve: Curve, covariates: list[np.ndarray], latents: int, parameters: int) -> None:
        self.curve, self.covariates = curve, covariates
        self.latents = (Prior("about the cohort's", 0.0, 1.0),) * latents
        self.latent_sds = (Prior("log sd", 0.0, 1.0),) * latents
        self.parameters = (Prior("fixed", 0.0, 1.0),) * parameters

    def loss(self, hours, latents, parameters):
        rows = np.rint(hours).astype(int)
        seen = [covariate[rows] for covariate in self.covariates]

        def at(beta):
            return -self.curve(*seen, np.moveaxis(beta, -1, 0), np.moveaxis(latents, -1, 0))

        value = at(parameters)
        steps = STEP * np.diag(np.maximum(1.0, np.abs(parameters.reshape(-1, len(self.parameters))[0])))
        slopes = tuple((at(parameters + step) - at(parameters - step)) / (2.0 * step.sum()) for step in steps)
        return Loss(value, np.zeros_like(value), slopes)

    def half_life_hours(self, latents, parameters):
        raise NotImplementedError


@dataclass(frozen=True)
class Model:
    """A reference fit by its name there; random: names of its random effects, in the order of the latents."""

    data: str
    subject: str
    response: str
    covariates: tuple[str, ...]
    curve: Curve
    random: tuple[str, ...]
    more: int = 0  # parameters beyond the fixed effects


def asymptotic(age, beta, b):
    """SSasymp."""
    asymptote = beta[0] + b[0]
    return asymptote + (beta[1] - asymptote) * np.exp(-np.exp(beta[2]) * age)


def logistic_asymptote(age, beta, b):
    """SSlogis."""
    return (beta[0] + b[0]) / (1.0 + np.exp((beta[1] - age) / beta[2]))


def logistic_of_log(conc, beta, b):
    return (beta[0] + b[0]) / (1.0 + np.exp((beta[1] - np.log(conc)) / (beta[2] + b[1])))


def first_order(dose, time, beta, b):
    """SSfol: one compartment, absorption and elimination of first order."""
    elimination, absorption, clearance = beta[0], beta[1] + b[0], beta[2] + b[1]
    scale = dose * np.exp(elimination + absorption - clearance) / (np.exp(absorption) - np.exp(elimination))
    return scale * (np.exp(-np.exp(elimination) * time) - np.exp(-np.exp(absorption) * time))


def offset_asymptotic(conc, beta, b):
    """SSasympOff; the second random effect leans on the first by beta[3]: so the two are correlated."""
    rate = np.exp(beta[1] + beta[3] * b[0] + b[1])
    return (beta[0] + b[0]) * (1.0 - np.exp(-rate * (conc - beta[2])))


MODELS = {
    "Orange_ML_Asym": Model("Orange", "Tree", "circumference", ("age",), logistic_asymptote, ("Asym",)),
    "Loblolly_ML_Asym": Model("Loblolly", "Seed", "height", ("age",), asymptotic, ("Asym",)),
    "DNase_ML_diag": Model("DNase", "Run", "density", ("conc",), logistic_of_log, ("Asym", "scal")),
    "Theoph_ML_lKa_lCl": Model("Theoph", "Subject", "conc", ("Dose", "Time"), first_order, ("lKa", "lCl")),
    "CO2_ML_Asym_lrc": Model("CO2", "Plant", "uptake", ("conc",), offset_asymptotic, ("Asym", "lrc"), more=1),
}


@dataclass(frozen=True)
class Found:
    fixed: np.ndarray
    latent_sds: np.ndarray
    residual_sd: float
    log_likelihood: float
    more: np.ndarray
    predicted: dict[str, float]  # of the first random effect


@pytest.fixture
def fine_grid(monkeypatch: pytest.MonkeyPatch) -> Iterator[None]:
    monkeypatch.setattr(quadrature, "SPACING", {1: (0.4, 0.9), 2: (0.5, 1.1)})
    monkeypatch.setattr(quadrature, "REACH", 5.0)
    standard_nodes.cache_clear()
    yield
    standard_nodes.cache_clear()


def posed(model: Model, n_fixed: int) -> tuple[Problem, list[str]]:
    """No days, the level at zero, and what units share held: fixed effects are parameters of the curve."""
    data = table(model.data)
    names, who = np.unique(data[model.subject], return_inverse=True)
    order = np.argsort(who, kind="stable")
    seen = [numbers(data, name)[order] for name in model.covariates]
    shape = RowByRow(model.curve, seen, len(model.random), n_fixed + model.more)
    rows = np.arange(len(who), dtype=float)
    y = numbers(data, model.response)[order]
    events = events_of(who[order], rows, y, np.zeros(len(who), dtype=np.int64))
    whole = problem_of(events, shape, flat=False)
    shared = ~whole.effects.is_day
    names_of_shared = tuple(name for name, keep in zip(whole.effects.names, shared, strict=True) if keep)
    held = Effects(names_of_shared, np.zeros(shared.sum()), np.full(shared.sum(), 1e-16), np.full(shared.sum(), -1))
    batches = make_batches(events, held, len(shape.latents), LineError(0.0, 1.0))
    plan = plan_assembly([batch.columns for batch in batches], len(held.names))
    return Problem(events, whole.layout, held, batches, plan), list(names)


def likelihood(problem: Problem, theta: np.ndarray) -> Outcome:
    return settle(problem, theta, start(problem, theta), 12, 1e-9)


def reference_theta(model: Model, problem: Problem, wanted: dict) -> np.ndarray:
    sds = np.array([sd_of(wanted, name) for name in model.random])
    leaning = []
    if model.more:  # the second effect's own part, and how it leans on the first
        correlation = float(wanted["VarCorr"][model.random[1]].split()[2])
        leaning = [correlation * sds[1] / sds[0]]
        sds[1] *= np.sqrt(1.0 - correlation**2)
    theta = theta_of(problem, level=NO_LEVEL, residual=np.log(wanted["sigma"]), day=0.0, latents=tuple(np.log(sds)))
    theta[problem.layout.shape_slots] = [*wanted["fixed"].values(), *leaning]
    return theta


@cache
def maximised(name: str) -> Found:
    """From a standard error off in every fixed effect, and a third in every standard deviation."""
    model, wanted = MODELS[name], RESULTS[name]
    problem, names = posed(model, len(wanted["fixed"]))
    layout, n = problem.layout, len(wanted["fixed"])
    theta = reference_theta(model, problem, wanted)
    free = np.r_[1, layout.latent_slots, layout.shape_slots]
    width = np.r_[0.2, [0.3] * len(model.random), list(wanted["se"].values()), [0.01] * model.more]

    def loss(z: np.ndarray) -> tuple[float, np.ndarray]:
        moved = theta.copy()
        moved[free] += width * z
        outcome = likelihood(problem, moved)
        return -outcome.log_evidence, -outcome.score[free] * width

    near = minimize(loss, np.ones(len(free)), jac=True, method="BFGS", options={"gtol": 1e-4})
    # A value is good to some 1e-4, where a line search gives up; its slope is smoother, and leads to the very top.
    best = root(lambda z: loss(z)[1], near.x, options={"eps": 1e-4}).x
    assert np.abs(loss(best)[1]).max() < 1e-3
    assert loss(best)[0] < near.fun + 5e-4
    theta[free] += width * best
    outcome, shape = likelihood(problem, theta), theta[layout.shape_slots]
    predicted = {}
    for batch, seen in zip(problem.batches, outcome.units, strict=True):
        predicted |= {names[u]: float(mean) for u, mean in zip(batch.unit, seen.latent_mean[:, 0], strict=True)}
    sds = np.exp(theta[layout.latent_slots])
    return Found(shape[:n], sds, float(np.exp(theta[1])), outcome.log_evidence, shape[n:], predicted)


def sd_of(wanted: dict, effect: str) -> float:
    return float(wanted["VarCorr"][effect].split()[1])


def at_reference(name: str) -> tuple[Problem, np.ndarray, float]:
    model, wanted = MODELS[name], RESULTS[name]
    problem, _ = posed(model, len(wanted["fixed"]))
    theta = reference_theta(model, problem, wanted)
    return problem, theta, likelihood(problem, theta).log_evidence


LINEAR = pytest.mark.parametrize("name", ["Orange_ML_Asym", "Loblolly_ML_Asym"])
NONLINEAR = pytest.mark.parametrize("name", list(LINEARISING_COSTS_NATS))


@pytest.mark.usefixtures("fine_grid")
class TestTheLikelihood:
    @LINEAR
    def test_linear_in_the_random_effect_is_nlmes(self, name: str) -> None:
        """All of its printed digits."""
        assert at_reference(name)[2] == pytest.approx(RESULTS[name]["logLik"], abs=1e-9)

    @NONLINEAR
    def test_nonlinear_in_it_is_the_integral(self, name: str) -> None:
        """An even grid of 401 x 401 for each of the first four subjects."""
        problem, theta, log_likelihood = at_reference(name)
        seen = likelihood(problem, theta).units
        owners = np.concatenate([batch.unit for batch in problem.batches])
        each = np.concatenate([one.log_evidence for one in seen])[np.argsort(owners)]
        wanted = [brute_force(problem.events, unit, problem, theta) for unit in range(4)]
        np.testing.assert_allclose(each[:4], wanted, rtol=0, atol=1e-6)
        costs = log_likelihood - RESULTS[name]["logLik"]
        assert costs == pytest.approx(LINEARISING_COSTS_NATS[name], abs=5e-4)  # measured here, by the integral


class TestTheShippedGrid:
    @LINEAR
    def test_is_good_to_a_ten_thousandth_of_a_nat(self, name: str) -> None:
        assert at_reference(name)[2] == pytest.approx(RESULTS[name]["logLik"], abs=1e-4)

    @NONLINEAR
    def test_is_good_to_thousandths_with_two_latents(self, name: str) -> None:
        costs = at_reference(name)[2] - RESULTS[name]["logLik"]
        assert costs == pytest.approx(LINEARISING_COSTS_NATS[name], abs=2e-3)


@pytest.mark.parametrize("name", list(MODELS))
def test_the_maximum_is_no_lower_than_nlmes_and_near_it(name: str) -> None:
    """A third of a standard error at most between nlme's approximate estimates and the likelihood's own."""
    model, wanted = MODELS[name], RESULTS[name]
    found = maximised(name)
    assert found.log_likelihood > at_reference(name)[2]
    off = (found.fixed - list(wanted["fixed"].values())) / list(wanted["se"].values())
    assert np.abs(off).max() < 1 / 3
    assert found.residual_sd == pytest.approx(wanted["sigma"], rel=2e-3)
    assert found.latent_sds[0] == pytest.approx(sd_of(wanted, model.random[0]), rel=0.025)
    predicted = [found.predicted[str(row["level"])] for row in wanted["ranef"]]
    in_sds = (np.array(predicted) - [row[model.random[0]] for row in wanted["ranef"]]) / found.latent_sds[0]
    assert np.abs(in_sds).max() < 0.11


REMEMBERED = {
    # Orange trees: the worked example of a published procedure for nonlinear mixed models by adaptive Gaussian
    # quadrature, and Laplace's fit by lme4's nlmer, which is exact here (Pinheiro & Bates 2000, chapter 8, data).
    "Orange_ML_Asym": ({"Asym": 192.05, "xmid": 727.91, "scal": 348.07}, 31.646, 7.843),
    # Theophylline: the same procedure's worked example. It also lets the two effects be correlated, and finds
    # all but nothing (-0.00127).
    "Theoph_ML_lKa_lCl": ({"lKe": -2.4592, "lKa": 0.4806, "lCl": -3.2268}, 0.4331**0.5, 0.5016**0.5),
}


@pytest.mark.parametrize("name", list(REMEMBERED))
def test_the_maximum_is_that_of_adaptive_quadrature(name: str) -> None:
    """The wanted numbers are from memory, not seen when this was written: four digits."""
    fixed, latent_sd, residual_sd = REMEMBERED[name]
    found = maximised(name)
    np.testing.assert_allclose(found.fixed, list(fixed.values()), rtol=1e-3)
    assert found.latent_sds[0] == pytest.approx(latent_sd, rel=3e-3)
    assert found.residual_sd == pytest.approx(residual_sd, rel=5e-4)


def test_correlated_effects_too() -> None:
    """nlme, linearised: sd 0.1995 and correlation -0.777 of CO2's log rate with its asymptote."""
    found, wanted = maximised("CO2_ML_Asym_lrc"), RESULTS["CO2_ML_Asym_lrc"]
    leaning = found.more[0] * found.latent_sds[0]
    sd = np.hypot(leaning, found.latent_sds[1])
    assert sd == pytest.approx(sd_of(wanted, "lrc"), rel=0.01)
    assert leaning / sd == pytest.approx(-0.777, abs=0.005)
