"""The whole cohort's fit: every shape of loss, weighed by its evidence."""

from __future__ import annotations

import hashlib
from collections.abc import Mapping
from dataclasses import replace

import numpy as np
from numpy.typing import NDArray

from electrolog.errors import DataError
from electrolog.fouling.ascend import ROUGH, THOROUGH, Patience, Peak, Width, climb, rough_width, widths
from electrolog.fouling.batches import make_batches
from electrolog.fouling.effects import lay_out_effects, layout_for
from electrolog.fouling.events import EXPOSURE, READING, Events
from electrolog.fouling.fit import METHOD, CohortFit, Component, KeptUnits
from electrolog.fouling.line_error import LineError, learn_line_error
from electrolog.fouling.notes import notes_on
from electrolog.fouling.parameters import read_scales
from electrolog.fouling.points import normal_points
from electrolog.fouling.propagation import Problem, combine
from electrolog.fouling.shapes import ALL_SHAPES, SHAPES
from electrolog.fouling.shared import plan_assembly
from electrolog.fouling.subset import neighbours_in_time, take_units
from electrolog.fouling.summary import Fitted, summarise
from electrolog.fouling.young import settled_draws

Floats = NDArray[np.float64]
DRAWS = (32, 96)  # of the hyper-parameters, over all shapes: in a large cohort, in a young one
HOPELESS = 25.0  # nats behind the best shape: not climbed to its end
CLOSE = 10.0  # nats behind the best shape: its evidence is worth a closer look
PRIOR_ODDS = {"none": 0.1}  # against any other shape: a probe in use that doesn't foul at all is rare
SMALL, LARGE = 400, 2000  # units of a cohort that is climbed at once; of one that is climbed part by part
PART, LARGER = 300, 5  # units of the part of it that tells shapes apart, and by how much each part outgrows the last
YOUNG, YOUNG_DRAWS = 60, 32  # units of a young cohort; its draws of the hyper-parameters, each settled by itself
WORSE = 0.1  # nats a unit: more units of the same lab explain theirs as well as fewer did
LEAST_WEIGHT = 0.01  # a shape with less is named, but not drawn from


def fit_cohort(events: Events, *, shapes: tuple[str, ...] = ALL_SHAPES) -> CohortFit:
    """Fit every shape to all units' events and weigh them. Deterministic.

    Raises DataError for readings, hours or standard errors that are no numbers.
    """
    check_events(events)
    fits = fit_shapes(events, shapes)
    weights = weigh(fits)
    drawn = np.where(weights >= LEAST_WEIGHT, weights, 0.0)
    drawn /= drawn.sum()
    fitted = [one for fit, w in zip(fits, drawn, strict=True) if w > 0.0 for one in kept(*fit, float(w))]
    components = tuple(one.part for one in fitted)
    unsettled = tuple(
        p.layout.shape.name for (p, peak, _), w in zip(fits, drawn, strict=True) if w and not peak.converged
    )
    shape_weights = dict(zip(shapes, weights.tolist(), strict=True))
    return CohortFit(
        METHOD,
        fingerprint(events),
        line_error_of(events),
        shape_weights,
        components,
        len(events.units),
        int(np.sum(events.kind == READING)),
        not unsettled,
        notes_on(events, components, shape_weights, unsettled),
        summarise(events, fitted, shape_weights),
    )


def weigh(fits: list[tuple[Problem, Peak, Width]]) -> Floats:
    log_weight = np.array(
        [width.log_evidence + np.log(PRIOR_ODDS.get(p.layout.shape.name, 1.0)) for p, _, width in fits]
    )
    weight = np.exp(log_weight - log_weight.max())
    return np.asarray(weight / weight.sum())


def fit_shapes(events: Events, shapes: tuple[str, ...]) -> list[tuple[Problem, Peak, Width]]:
    """Every shape at its peak. In all but a small cohort a part tells the shapes apart."""
    n_units = len(np.unique(events.unit[events.kind == READING]))
    if n_units <= SMALL:
        return fit_each(events, shapes)
    fits = fit_each(take_units(events, neighbours_in_time(events, PART)), shapes, rough=True)
    return fit_likely(events, fits) if n_units <= LARGE else fit_by_parts(events, fits, n_units)


def fit_likely(events: Events, fits: list[tuple[Problem, Peak, Width]]) -> list[tuple[Problem, Peak, Width]]:
    """From the beginning, those that aren't far behind in the part: all units are few enough for that."""
    far = weigh(fits) < np.exp(-CLOSE)
    likely = tuple(p.layout.shape.name for (p, _, _), out in zip(fits, far, strict=True) if not out)
    found = iter(fit_each(events, likely))
    return [out_of_the_running(*one) if out else next(found) for one, out in zip(fits, far, strict=True)]


def fit_by_parts(
    events: Events, fits: list[tuple[Problem, Peak, Width]], n_units: int
) -> list[tuple[Problem, Peak, Width]]:
    """Those with weight go on to ever larger parts, and at last to all units, each time from where they ended: so near
    to the peak, a step or two suffice.
    """
    size = PART * LARGER
    while size * 2 < n_units:
        fits = fit_further(take_units(events, neighbours_in_time(events, size)), fits, ROUGH)
        size *= LARGER
    return fit_further(events, fits)


def fit_further(
    events: Events, fits: list[tuple[Problem, Peak, Width]], patience: Patience = THOROUGH
) -> list[tuple[Problem, Peak, Width]]:
    return [
        fit_on(events, *one[:2], patience) if weight >= LEAST_WEIGHT else out_of_the_running(*one)
        for one, weight in zip(fits, weigh(fits), strict=True)
    ]


def out_of_the_running(problem: Problem, peak: Peak, width: Width) -> tuple[Problem, Peak, Width]:
    """A part's evidence is no match for that of more units."""
    return problem, peak, replace(width, log_evidence=-np.inf)


def fit_on(events: Events, problem: Problem, peak: Peak, patience: Patience) -> tuple[Problem, Peak, Width]:
    """What fewer units have found is where more begin; with so many the scores' outer product is the curvature.

    Where that doesn't lead to an end as good, it is begun from the prior too: the stand-ins of days and units may have
    settled where a bad day is as many slips.
    """
    whole = pose(events, problem.layout.shape.name)
    top = climb(whole, beginning(whole, named(problem, peak)), patience=patience)
    if not top.converged or per_unit(whole, top) < per_unit(problem, peak) - WORSE:
        anew = climb(whole, beginning(whole, {}), patience=patience)
        top = max(top, anew, key=lambda one: one.log_posterior)
    return whole, top, rough_width(whole, top)


def named(problem: Problem, peak: Peak) -> dict[str, float]:
    return dict(zip((prior.name for prior in problem.layout.priors), peak.theta.tolist(), strict=True))


def beginning(problem: Problem, known: Mapping[str, float]) -> Floats:
    """Theta where a climb begins: what is known by name, the prior's mean of the rest."""
    return np.array([known.get(prior.name, prior.mean) for prior in problem.layout.priors])


def per_unit(problem: Problem, peak: Peak) -> float:
    return peak.log_posterior / max(1, len(problem.events.units))


def fit_each(events: Events, shapes: tuple[str, ...], rough: bool = False) -> list[tuple[Problem, Peak, Width]]:
    """One starts where the best so far ended, and is given up once it is hopelessly behind."""
    climbed: list[tuple[Problem, Peak]] = []
    known: dict[str, float] = {}
    best = -np.inf
    for name in shapes:
        problem = pose(events, name)
        peak = climb(
            problem, beginning(problem, known), best - (CLOSE if rough else HOPELESS), ROUGH if rough else THOROUGH
        )
        if peak.log_posterior > best:
            best = peak.log_posterior
            known |= named(problem, peak)
        climbed.append((problem, peak))
    guesses = [(problem, peak, rough_width(problem, peak)) for problem, peak in climbed]
    if rough:
        return guesses
    least = max(width.log_evidence for _, _, width in guesses) - CLOSE
    return [(p, peak, widths(p, peak) if guess.log_evidence > least else guess) for p, peak, guess in guesses]


def check_events(events: Events) -> None:
    read = events.kind == READING
    if not np.all(np.isfinite(events.amount)):
        raise DataError(
            "an exposure, a renewal or a reading has no finite number",
            "leave out calibrations whose slope has no logarithm, and give every exposure its hours",
        )
    if np.any(events.amount[events.kind == EXPOSURE] < 0.0):
        raise DataError("an exposure has negative hours", "give every exposure the hours that it lasted")
    if np.any(np.diff(events.unit) < 0):
        raise DataError("events aren't sorted by unit", "sort them by unit, then by time")
    if np.any(events.se[read] < 0.0):
        raise DataError("a standard error is negative", "give NaN where it is unknown")


def line_error_of(events: Events) -> LineError:
    return learn_line_error(events.se[events.kind == READING])


def pose(events: Events, shape_name: str) -> Problem:
    shape = SHAPES[shape_name]
    layout = layout_for(shape, events)
    effects = lay_out_effects(shape, layout.group_sds, events)
    batches = make_batches(events, effects, len(shape.latents), line_error_of(events))
    return Problem(events, layout, effects, batches, plan_assembly([b.columns for b in batches], len(effects.names)))


def kept(problem: Problem, peak: Peak, width: Width, weight: float) -> list[Fitted]:
    if len(problem.events.units) > YOUNG:
        return [Fitted(problem, peak.outcome, keep(problem, peak, width, weight))]
    draws = settled_draws(problem, peak, width, max(4, round(YOUNG_DRAWS * weight)))
    return [Fitted(problem, one.outcome, keep(problem, one, width, weight / len(draws))) for one in draws]


def keep(problem: Problem, peak: Peak, width: Width, weight: float) -> Component:
    # The last sweep has renewed the stand-ins: the shared effects have to be those of the stand-ins that are kept,
    # or a unit taken out again would leave a negative precision behind.
    combine(problem, read_scales(problem.layout, peak.theta), peak.state)
    count = number_of_draws(len(problem.events.units), weight)
    theta = peak.theta + normal_points(count, len(peak.theta)) @ np.linalg.cholesky(width.covariance).T
    mean = peak.state.mean[:-1]
    labels = problem.events.units
    units = tuple(
        KeptUnits(tuple(labels[u] for u in batch.unit), batch.columns, site.precision, site.shift)
        for batch, site in zip(problem.batches, peak.state.sites, strict=True)
    )
    moved = mean + (theta - peak.theta) @ width.effects_per_theta.T
    return Component(
        problem.layout,
        problem.effects,
        weight,
        peak.theta,
        theta,
        width.covariance,
        mean,
        moved,
        peak.state.covariance,
        units,
    )


def number_of_draws(n_units: int, weight: float) -> int:
    if n_units <= YOUNG:  # its draws are components, each at its own theta
        return 1
    return max(1, round(float(np.clip(10_000 // n_units, *DRAWS)) * weight))


def fingerprint(events: Events) -> str:
    digest = hashlib.sha256()
    for column in (events.unit, events.kind, events.which, events.amount, events.se):
        digest.update(np.ascontiguousarray(column).tobytes())
    names = (events.units, events.settings, events.renewals, events.days, sorted(events.groups.items()))
    digest.update(repr(names).encode())
    return digest.hexdigest()
