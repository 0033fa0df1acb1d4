"""How good forecasts of a lab's own later readings would have been, beside the simpler ways of a notebook.

Everything is in logs of sensitivity: 0.10 is about ten percent. The rivals are given an honest spread each, learned
from the same past: robust, because a slip of a decimal in that past would else make them uselessly wide, and Student's
t with few degrees of freedom, because one in what is forecast would else be charged without bound.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from electrolog.judge import odds, scores
from electrolog.judge.scores import Coverage

Array = NDArray[np.float64]
Integers = NDArray[np.int64]
LEVELS = (0.5, 0.8, 0.9)
PIT_CLASSES = 10
RIVAL_DF = 5.0
PARTS = 500  # normals that a Student's t is made of
LEAST_SD = 1e-3  # a past without any scatter promises nothing
MAD_TO_SD = 1.4826  # of a normal


@dataclass(frozen=True)
class Predictive:
    """Of N readings: a mixture of D equally weighted normals each, centre and sd (N, D)."""

    centre: Array
    sd: Array

    def draws(self) -> Array:
        """(N, D) one draw of each normal, the same every time."""
        from scipy.special import ndtri

        count, parts = self.centre.shape
        even = np.tile(ndtri((np.arange(parts) + 0.5) / parts), (count, 1))
        return np.asarray(self.centre + self.sd * np.random.default_rng(parts).permuted(even, axis=1))

    def log_score(self, reading: Array) -> Array:
        """(N,) minus log density at the readings; less is better."""
        from scipy.special import logsumexp

        misfit = (reading[:, None] - self.centre) / self.sd
        densities = -0.5 * misfit**2 - np.log(self.sd * np.sqrt(2 * np.pi))
        return -np.asarray(logsumexp(densities, axis=1) - np.log(densities.shape[1]), dtype=float)


def joined(parts: list[Predictive]) -> Predictive:
    """Of one method over several windows; the widest of equal steps through the draws gives all the same number."""
    least = min(part.centre.shape[1] for part in parts)
    thinned = [_thinned(part, least) for part in parts]
    return Predictive(np.concatenate([p.centre for p in thinned]), np.concatenate([p.sd for p in thinned]))


def _thinned(part: Predictive, count: int) -> Predictive:
    kept = np.arange(count) * part.centre.shape[1] // count
    return Predictive(part.centre[:, kept], part.sd[:, kept])


# --- the rivals -------------------------------------------------------------------------------------------


@dataclass(frozen=True)
class Past:
    """M readings of the cohort, in the order of time within a unit: exposure so far and log sensitivity."""

    unit: Integers
    kind: Integers  # of the unit: readings with different waveforms are not compared
    hours: Array
    reading: Array


@dataclass(frozen=True)
class Targets:
    """N readings to be forecast; each one's own past is padded with NaN to (N, n), the latest last."""

    kind: Integers
    hours: Array
    own_hours: Array
    own_reading: Array


def last_value(past: Past, targets: Targets) -> Predictive:
    """The probe's last reading; strays like the cohort's readings from their last ones."""
    steps = np.diff(past.reading)[np.diff(past.unit) == 0]
    return student(targets.own_reading[:, -1], np.full(len(targets.hours), _robust_sd(steps)))


def own_line(past: Past, targets: Targets) -> Predictive:
    """The straight line through the probe's own points; the last value where they draw none.

    Strays as the points of the cohort's own lines do, more so the farther it is drawn out.
    """
    lines = _lines(targets.own_hours, targets.own_reading)
    away = targets.hours - lines.centre_hours
    sd = _robust_sd(_residuals_of_lines(past))
    plain = last_value(past, targets)
    with np.errstate(invalid="ignore", divide="ignore"):
        reach = np.sqrt(1 + 1 / lines.count + away**2 / lines.spread_hours2)
        drawn = student(lines.centre + lines.slope * away, sd * reach)
    has_line = (lines.spread_hours2 > 0)[:, None]
    return Predictive(np.where(has_line, drawn.centre, plain.centre), np.where(has_line, drawn.sd, plain.sd))


def cohort_mean(past: Past, targets: Targets) -> Predictive:
    """What the cohort's readings were on average at that exposure: a line through all of one waveform's."""
    centre, sd = np.zeros(len(targets.hours)), np.ones(len(targets.hours))
    for kind in np.unique(targets.kind):
        known, asked = past.kind == kind, targets.kind == kind
        known = known if known.any() else np.ones(len(past.kind), dtype=bool)
        line = _lines(past.hours[known][None], past.reading[known][None])
        slope = line.slope[0] if line.spread_hours2[0] > 0 else 0.0
        strays = past.reading[known] - line.centre - slope * (past.hours[known] - line.centre_hours)
        centre[asked] = line.centre + slope * (targets.hours[asked] - line.centre_hours)
        sd[asked] = _robust_sd(strays)
    return student(centre, sd)


def student(centre: Array, scale: Array) -> Predictive:
    """Student's t as a mixture of normals whose variances are scaled inverse chi-squared."""
    from scipy.special import chdtri

    ranks = (np.arange(PARTS) + 0.5) / PARTS
    stretch = np.sqrt(RIVAL_DF / np.asarray(chdtri(RIVAL_DF, ranks), dtype=float))
    return Predictive(np.repeat(centre[:, None], PARTS, axis=1), scale[:, None] * stretch)


def _robust_sd(strays: Array) -> float:
    """About zero, for what a rival doesn't expect is its error; without any past, a factor of two either way."""
    if not len(strays):
        return float(np.log(2.0))
    return max(MAD_TO_SD * float(np.median(np.abs(strays))), LEAST_SD)


@dataclass(frozen=True)
class _Lines:
    count: Array
    centre_hours: Array
    centre: Array
    slope: Array
    spread_hours2: Array


def _lines(hours: Array, reading: Array) -> _Lines:
    """Least squares of each row (N, n), NaN left out; spread 0 and slope NaN where there is one exposure alone."""
    real = np.isfinite(reading)
    count = real.sum(axis=1).astype(float)
    x, y = np.where(real, hours, 0.0), np.where(real, reading, 0.0)
    x_mean, y_mean = x.sum(axis=1) / count, y.sum(axis=1) / count
    off = np.where(real, hours - x_mean[:, None], 0.0)
    spread = (off**2).sum(axis=1)
    spread = np.where(spread > 1e-9, spread, 0.0)
    with np.errstate(invalid="ignore", divide="ignore"):
        slope = (off * y).sum(axis=1) / np.where(spread > 0, spread, np.nan)
    return _Lines(count, x_mean, y_mean, slope, spread)


def _residuals_of_lines(past: Past) -> Array:
    """Of every unit with three readings or more, scaled up for the two numbers its line took."""
    found = [np.zeros(0)]
    for unit in np.unique(past.unit):
        own = past.unit == unit
        line = _lines(past.hours[own][None], past.reading[own][None])
        if own.sum() > 2 and line.spread_hours2[0] > 0:
            strays = past.reading[own] - line.centre - line.slope * (past.hours[own] - line.centre_hours)
            found.append(strays * np.sqrt(own.sum() / (own.sum() - 2)))
    return np.concatenate(found)


# --- the scores -------------------------------------------------------------------------------------------


@dataclass(frozen=True)
class Scored:
    """One method on N readings. crps and log_score are means (less is better); crps_each, pit (N,)."""

    method: str
    crps: float
    crps_median: float
    log_score: float
    coverage: tuple[Coverage, ...]
    pit_counts: tuple[int, ...]
    crps_each: Array
    pit: Array


def score(method: str, forecast: Predictive, reading: Array) -> Scored:
    draws = forecast.draws()
    each, pit = scores.crps(draws, reading), scores.pit(draws, reading)
    counts = np.histogram(pit, bins=PIT_CLASSES, range=(0.0, 1.0))[0]
    return Scored(
        method,
        float(each.mean()),
        float(np.median(each)),
        float(forecast.log_score(reading).mean()),
        tuple(scores.coverage(draws, reading, level) for level in LEVELS),
        tuple(int(count) for count in counts),
        each,
        pit,
    )


@dataclass(frozen=True)
class FitVerdicts:
    """How often the odds said `fit` for a run that was then logged, and how often the reading after it said otherwise.

    expected: how often it should have, by the forecast itself, the reading's own error included. low and high: 95 %
    interval of the wrong ones' share.
    """

    runs: int
    fit: int
    wrong: int
    expected: float
    low: float
    high: float


def fit_verdicts(
    log_end: Array, least: Array, risk: float, reading: Array, least_reading: Array, reading_draws: Array
) -> FitVerdicts:
    """log_end (N, D): true log sensitivity at the run's end; least (N, D): what it may not fall below; least_reading
    (N,): the same for the reading, from readings alone. NaN: can't be told, so no verdict of fit is counted.
    """
    told = np.isfinite(least).all(axis=1) & np.isfinite(least_reading)
    called = told & (odds.below(log_end, least).mean(axis=1) <= risk)
    wrong = called & (reading < least_reading)
    expected = (reading_draws[called] < least_reading[called, None]).mean(axis=1).sum()
    count = int(called.sum())
    low, high = scores.share_interval(int(wrong.sum()), count)
    return FitVerdicts(int(told.sum()), count, int(wrong.sum()), float(expected), low, high)
