"""From the current of an unknown back to its concentration, with an interval."""

from __future__ import annotations

import math
from dataclasses import dataclass

from electrolog.errors import InputError
from electrolog.measure.line import LineFit
from electrolog.measure.points import p_against_zero
from electrolog.measure.tails import t_quantile


@dataclass(frozen=True)
class InversePrediction:
    """In µM. None: the line can't say, and `why_not` says why.

    The delta interval is symmetrical, ± t·se; the Fieller interval is exact for a straight line with normal
    scatter and leans to the side where the line knows less. They part as the slope's own error grows.
    """

    concentration_um: float | None
    se_um: float | None
    delta_um: tuple[float, float] | None
    fieller_um: tuple[float, float] | None
    why_not: str | None = None


def predict_concentration(
    fit: LineFit, current_na: float, replicates: int = 1, *, weight: float = 1.0, confidence: float = 0.95
) -> InversePrediction:
    """current_na: the mean of `replicates` measurements, each of `weight` (the mean of the points' is one).

    Delta: Miller & Miller, chapter 5; Fieller: Draper & Smith, chapter 3.
    """
    if replicates < 1 or weight <= 0 or not 0 < confidence < 1 or not math.isfinite(current_na):
        raise InputError(
            f"{current_na} nA from {replicates} replicates of weight {weight} at confidence {confidence}: needed "
            "are a finite current, one replicate or more, a weight above 0 and a confidence between 0 and 1"
        )
    why_not = _without_slope(fit, 1 - confidence)
    if why_not:
        return InversePrediction(None, None, None, None, why_not)
    estimate_um = (current_na - fit.intercept_na) / fit.slope_na_um
    if fit.degrees_of_freedom < 1:
        return InversePrediction(estimate_um, None, None, None, "no degree of freedom: no interval")
    t = t_quantile((1 + confidence) / 2, fit.degrees_of_freedom)
    own = 1 / (replicates * weight) + (0.0 if fit.through_zero else 1 / fit.n_points)
    se_um = _se_um(fit, estimate_um, own)
    delta_um = (estimate_um - t * se_um, estimate_um + t * se_um)
    return InversePrediction(estimate_um, se_um, delta_um, _fieller_um(fit, estimate_um, own, t))


def _without_slope(fit: LineFit, level: float) -> str | None:
    p = p_against_zero(fit.slope_na_um, fit.slope_se_na_um, fit.degrees_of_freedom)
    if math.isfinite(fit.slope_na_um) and fit.slope_na_um != 0 and not p >= level:
        return None
    return (
        f"the slope {fit.slope_na_um:.3g} ± {fit.slope_se_na_um:.3g} nA/µM can't be told from zero "
        f"(p = {p:.2g}): any concentration could have given this current"
    )


def _se_um(fit: LineFit, estimate_um: float, own: float) -> float:
    from_centre = (estimate_um - fit.centre_um) ** 2 / fit.spread_um2
    unit_um = fit.residual_sd_na / abs(fit.slope_na_um)
    return unit_um * math.sqrt(own + from_centre)


def _fieller_um(fit: LineFit, estimate_um: float, own: float, t: float) -> tuple[float, float]:
    """g below one: the slope is told from zero at this confidence, so that both ends are finite."""
    g = (t * fit.slope_se_na_um / fit.slope_na_um) ** 2
    away_um = estimate_um - fit.centre_um
    spread = (1 - g) * own + away_um**2 / fit.spread_um2
    half_um = t * fit.residual_sd_na / abs(fit.slope_na_um) * math.sqrt(spread)
    return fit.centre_um + (away_um - half_um) / (1 - g), fit.centre_um + (away_um + half_um) / (1 - g)
