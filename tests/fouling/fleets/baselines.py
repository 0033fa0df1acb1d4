"""What a lab does without a model of fouling, made as good as it can be: draws of log sensitivity, (U, D).

Both are told the true weights of the settings and the true windings-back of the renewals.
"""

from __future__ import annotations

import warnings

import numpy as np
from scipy.special import ndtri

from electrolog.fouling.events import READING
from tests.fouling.fleets.generator import Array
from tests.fouling.fleets.simulate import AHEAD_H, Fleet, last_rows, walk

N_DRAWS = 400


def last_value(fleet: Fleet) -> tuple[Array, Array]:
    """Now and ahead: the last reading, give or take what readings of one probe have differed by before."""
    events = fleet.events
    at = np.flatnonzero(events.kind == READING)
    same = events.unit[at][1:] == events.unit[at][:-1]
    differences = np.diff(events.amount[at])[same]
    spread = np.sqrt(np.mean(differences**2)) if differences.size else np.nan
    last = np.full(len(events.units), np.nan)
    last[events.unit[at]] = events.amount[at]
    draws = _normal(last, np.full(last.size, spread))
    return draws, draws


def mixed_model(fleet: Fleet) -> tuple[Array, Array]:
    """Now and ahead: a straight line per unit over the clock, intercepts and slopes random and correlated."""
    from statsmodels.regression.mixed_linear_model import MixedLM

    events, state, last = fleet.events, walk(fleet.truth.generator, fleet.events), last_rows(fleet.events)
    at = np.flatnonzero(events.kind == READING)
    design = _line(state.clock_h[at])
    with warnings.catch_warnings():
        warnings.simplefilter("ignore")  # of a variance at zero: the fit is taken as it is
        model = MixedLM(events.amount[at] - state.log_area[at], design, events.unit[at], exog_re=design)
        fit = model.fit(reml=True)
    between, noise = np.asarray(fit.cov_re), float(fit.scale)
    fixed, fixed_covariance = np.asarray(fit.fe_params), np.asarray(fit.cov_params())[:2, :2]
    now, ahead = np.full((2, len(events.units), 2), np.nan)
    for unit in np.unique(events.unit[at]):
        mine = events.unit[at] == unit
        y = events.amount[at][mine] - state.log_area[at][mine]
        end = state.clock_h[last[unit]]
        for found, clock_h in ((now, end), (ahead, end + AHEAD_H)):
            target = _line(np.array([clock_h]))[0]
            found[unit] = _predict(y, design[mine], target, fixed, fixed_covariance, between, noise)
            found[unit, 0] += state.log_area[last[unit]]
    return _normal(*now.T), _normal(*ahead.T)


def _predict(
    y: Array,
    design: Array,
    target: Array,
    fixed: Array,
    fixed_covariance: Array,
    between: Array,
    noise: float,
) -> tuple[float, float]:
    """The best linear unbiased prediction, with its standard error (Henderson 1975)."""
    gain = np.linalg.solve(design @ between @ design.T + noise * np.eye(y.size), design @ between).T
    mean = target @ (fixed + gain @ (y - design @ fixed))
    of_random = target @ (between - gain @ design @ between) @ target
    left = target - design.T @ gain.T @ target
    return float(mean), float(np.sqrt(max(0.0, float(of_random + left @ fixed_covariance @ left))))


def _line(clock_h: Array) -> Array:
    # in tens of hours: in hours the search for the variances ends early
    return np.column_stack([np.ones(clock_h.size), clock_h / 10])


def _normal(mean: Array, sd: Array) -> Array:
    return np.asarray(mean[:, None] + sd[:, None] * ndtri((np.arange(N_DRAWS) + 0.5) / N_DRAWS))
