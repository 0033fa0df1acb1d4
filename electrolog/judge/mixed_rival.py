"""The linear mixed model as a rival: log sensitivity falls along a straight line with hours of exposure, and level and
slope differ from unit to unit about the cohort's own (Laird & Ware 1982, doi:10.2307/2529876).

Fitted by REML to the cohort's past; each unit's line is then predicted from its own readings (Henderson's best linear
unbiased prediction), with what the fit leaves open of the cohort's line. Waveforms have lines of their own.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from electrolog.fouling.mixed import MixedFit, Term, fit_mixed
from electrolog.judge.backtest import RIVAL_DF, Array, Past, Predictive, Targets, last_value, student

FEWEST_READ_TWICE = 4  # units: below that there is nothing to tell slopes apart by


def linear_mixed(past: Past, targets: Targets) -> Predictive:
    """The last value where the cohort's past, or that of the target's waveform, is too small for it."""
    plain = last_value(past, targets)
    kinds = _kinds_with_a_line(past)
    if not len(kinds):
        return plain
    known = np.isin(past.kind, kinds)
    unit = np.unique(past.unit[known], return_inverse=True)[1]
    unit_hours = float(
        np.std(past.hours[known])
    )  # hours that count as one, so that levels and slopes are alike in size
    line = _line(past.hours[known] / unit_hours)
    fit = fit_mixed(past.reading[known], _of_kinds(line, past.kind[known], kinds), (Term(unit, line),))
    told = np.isin(targets.kind, kinds)
    centre, sd = np.zeros(len(told)), np.ones(len(told))
    for k in np.flatnonzero(told).tolist():
        centre[k], sd[k] = _predicted(fit, targets, k, kinds, unit_hours)
    drawn = student(centre, sd * np.sqrt((RIVAL_DF - 2.0) / RIVAL_DF))  # with that standard deviation
    return Predictive(np.where(told[:, None], drawn.centre, plain.centre), np.where(told[:, None], drawn.sd, plain.sd))


def _kinds_with_a_line(past: Past) -> NDArray[np.int64]:
    """Waveforms with enough units that were read at two exposures or more."""
    exposures = np.unique(np.stack([past.kind, past.unit, past.hours]), axis=1)[:2]
    units, counts = np.unique(exposures, axis=1, return_counts=True)
    kinds, enough = np.unique(units[0, counts > 1], return_counts=True)
    return kinds[enough >= FEWEST_READ_TWICE].astype(np.int64)


def _line(hours: Array) -> Array:
    return np.stack([np.ones_like(hours), hours], axis=-1)


def _of_kinds(line: Array, kind: NDArray[np.int64], kinds: NDArray[np.int64]) -> Array:
    """(N, 2 K) level and slope of each waveform."""
    own = (kind[:, None] == kinds)[:, :, None] * line[:, None, :]
    return np.asarray(own.reshape(len(line), 2 * len(kinds)))


def _predicted(
    fit: MixedFit, targets: Targets, k: int, kinds: NDArray[np.int64], unit_hours: float
) -> tuple[float, float]:
    """Of the next reading: centre and standard deviation."""
    own = np.isfinite(targets.own_reading[k])
    seen = _line(targets.own_hours[k][own] / unit_hours)
    asked = _line(targets.hours[k : k + 1] / unit_hours)
    kind = targets.kind[k : k + 1]
    between = fit.covariances[0]
    covariance = seen @ between @ seen.T + fit.residual_sd**2 * np.eye(len(seen))
    gain = np.linalg.solve(covariance, seen @ between @ asked[0])
    fixed_seen = _of_kinds(seen, np.repeat(kind, len(seen)), kinds)
    left = _of_kinds(asked, kind, kinds)[0] - gain @ fixed_seen
    centre = left @ fit.fixed + gain @ targets.own_reading[k][own]
    of_unit = asked[0] @ between @ asked[0] - gain @ seen @ between @ asked[0]
    return float(centre), float(np.sqrt(of_unit + left @ fit.fixed_covariance @ left + fit.residual_sd**2))
