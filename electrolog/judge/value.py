"""What one more calibration would be worth, before anyone makes it (preposterior analysis).

The calibration's outcome isn't known yet, but the draws say which outcomes are likely: for each, the draws are
reweighted by how well they explain it, and the decision is made again. (Raiffa & Schlaifer, Applied Statistical
Decision Theory, 1961.)
"""

from __future__ import annotations

from dataclasses import dataclass
from statistics import NormalDist

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]

OUTCOMES = 128
GOLDEN = (5**0.5 - 1) / 2
FEWEST_DRAWS = 20  # an outcome explained by fewer draws than this would be judged by chance


@dataclass(frozen=True)
class ValueOfCalibration:
    """chance_fit: that the probe is fit for this run after it; chance_any_run: for the shortest of runs at least.

    p_breach_if_fit, p_breach_if_not: the odds by the run's end then, on average (None where that never happens).
    narrowing: share of the uncertainty about breaking, p(1 − p), that it would take away on average.
    saved_runs: expected loss that it saves, in wasted runs.
    """

    chance_fit: float
    chance_any_run: float
    p_breach_if_fit: float | None
    p_breach_if_not: float | None
    narrowing: float
    saved_runs: float


def value_of_calibration(
    log_now: Array,
    log_end: Array,
    broken_now: NDArray[np.bool_],
    broken_at_end: NDArray[np.bool_],
    *,
    reading_sd_log: float,
    accepted_risk: float,
    widest_interval: float | None = None,
    stands: bool = True,
    outcomes: int = OUTCOMES,
) -> ValueOfCalibration:
    """From joint draws (D,) of one probe.

    reading_sd_log: how far one calibration's reading strays from the truth. stands: whether the last calibration still
    does; where it doesn't, the probe can only be set aside as things are.
    """
    weights = _weights(log_now, reading_sd_log, outcomes)
    p_after = weights @ broken_at_end
    most_wide = np.inf if widest_interval is None else widest_interval
    fit = (p_after <= accepted_risk) & (_width(weights, log_end) <= most_wide)
    sound = (weights @ broken_now <= accepted_risk) & (_width(weights, log_now) <= most_wide)
    p_before = float(broken_at_end.mean())
    aside = float(_set_aside(p_before, accepted_risk))
    loss_now = min(p_before, aside) if stands else aside
    return ValueOfCalibration(
        chance_fit=float(fit.mean()),
        chance_any_run=float(sound.mean()),
        p_breach_if_fit=_mean(p_after[fit]),
        p_breach_if_not=_mean(p_after[~fit]),
        narrowing=_narrowing(p_before, p_after),
        saved_runs=max(0.0, loss_now - float(np.minimum(p_after, _set_aside(p_after, accepted_risk)).mean())),
    )


def _weights(log_now: Array, reading_sd_log: float, outcomes: int) -> Array:
    """(outcomes, D) weights of the draws after each likely reading; each row sums to 1."""
    index = np.arange(outcomes, dtype=np.float64)
    truths = np.sort(log_now)[((index + 0.5) / outcomes * len(log_now)).astype(int)]
    # Even in the truths, even in the errors, and by the golden ratio's lattice even in both together.
    errors = _normal_quantiles((index * GOLDEN + 0.5 / outcomes) % 1)
    low, high = np.quantile(log_now, [0.16, 0.84])  # not the deviation: draws of a dead probe are far out
    floor = float(high - low) / 2 * FEWEST_DRAWS / len(log_now)
    sd = max(reading_sd_log, floor, 1e-9)
    misfit = ((truths + sd * errors)[:, None] - log_now) / sd
    misfit *= misfit
    misfit -= misfit.min(axis=1, keepdims=True)
    np.minimum(misfit, 1000.0, out=misfit)  # beyond, the weight is nothing and its exponential slow
    raised = np.exp(-0.5 * misfit)
    return np.asarray(raised / raised.sum(axis=1, keepdims=True))


def _normal_quantiles(levels: Array) -> Array:
    """The standard library's: a verdict shouldn't wait for scipy over a hundred numbers."""
    return np.array([NormalDist().inv_cdf(level) for level in levels])


def _width(weights: Array, log_end: Array) -> Array:
    """Width of the 90 % interval over the median, of a lognormal with the reweighted draws' spread."""
    mean = weights @ log_end
    variance = np.maximum(weights @ log_end**2 - mean**2, 0.0)
    return np.asarray(2 * np.sinh(np.minimum(1.645 * np.sqrt(variance), 600.0)))


def _narrowing(p_before: float, p_after: Array) -> float:
    before = p_before * (1 - p_before)
    return float(np.clip(1 - (p_after * (1 - p_after)).mean() / before, 0.0, 1.0)) if before > 0 else 0.0


def _set_aside(p_breach: Array | float, accepted_risk: float) -> Array:
    """Expected loss of setting a probe aside that is good with odds 1 − p, in wasted runs.

    A probe costs risk / (1 − risk) runs: that is what accepting the risk says. Taking it loses p runs.
    """
    return np.asarray((1 - np.asarray(p_breach)) * accepted_risk / (1 - accepted_risk))


def _mean(values: Array) -> float | None:
    return float(values.mean()) if values.size else None
