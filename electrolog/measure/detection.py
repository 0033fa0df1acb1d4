"""What can be detected, and what can be quantified: by each recognised route, named by its standard.

Critical level: a result above it is called "present", with 5 % odds of being wrong. Detection limit: what is
then missed with 5 % odds. Quantification limit: where the relative standard deviation has fallen to 10 %.
The routes differ in whose scatter they use. The default, which `calibrate` states, is 3 × the signal's noise
over the sensitivity, and where no noise was measured 3 × the residual standard deviation.
"""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike

from electrolog.errors import DataError, InputError
from electrolog.measure.line import LineFit
from electrolog.measure.points import tells_from_zero
from electrolog.measure.tails import t_quantile

LOD_K, LOQ_K = 3.0, 10.0  # common practice, and IUPAC (Spectrochim. Acta B 33 (1978) 241)
Z_95 = 1.6448536269514722  # the normal distribution's 0.95 quantile


@dataclass(frozen=True)
class Limits:
    """In µM; None where a route defines none."""

    route: str
    critical_um: float | None
    lod_um: float
    loq_um: float | None


def from_noise(noise_na: float, sensitivity_na_um: float, k: float = LOD_K) -> Limits:
    """noise_na: standard deviation of the signal at rest."""
    return _k_sigma("the signal's noise", noise_na, sensitivity_na_um, k)


def from_residuals(residual_sd_na: float, sensitivity_na_um: float, k: float = LOD_K) -> Limits:
    """The scatter about the calibration stands in for that of a blank (Miller & Miller, chapter 5)."""
    return _k_sigma("residual standard deviation", residual_sd_na, sensitivity_na_um, k)


def from_blanks(blank_na: ArrayLike, sensitivity_na_um: float, k: float = LOD_K) -> Limits:
    blanks = np.asarray(blank_na, dtype=float)
    if blanks.size < 2:
        raise DataError(f"{blanks.size} blanks give no standard deviation; two or more are needed")
    sd_na = float(blanks.std(ddof=1))
    return _k_sigma(f"standard deviation of {blanks.size} blanks", sd_na, sensitivity_na_um, k)


def currie(blank_sd_na: float, sensitivity_na_um: float, freedom: int | None = None, *, paired: bool = False) -> Limits:
    """IUPAC 1995 (Currie, Pure Appl. Chem. 67 (1995) 1699): L_C = t·s0, L_D = δ·s0, L_Q = 10·s0.

    freedom: degrees of freedom of the blank's standard deviation; None: known exactly (L_D = 3.29 σ0).
    paired: a blank of its own is subtracted from each measurement and adds its variance.
    """
    _refuse_unless_positive(blank_sd_na, sensitivity_na_um)
    sd_um = blank_sd_na * (math.sqrt(2) if paired else 1.0) / sensitivity_na_um
    route = "IUPAC 1995 (Currie)" + (", paired blanks" if paired else "")
    return Limits(route, _t_95(freedom) * sd_um, _shift_seen(freedom) * sd_um, LOQ_K * sd_um)


def iso_11843(fit: LineFit, replicates: int = 1) -> Limits:
    """ISO 11843-2 (constant standard deviation): the uncertainty of the line joins that of the sample.

    replicates: measurements averaged per sample. Raises DataError where the slope can't be told from zero.
    """
    _refuse_without_response(fit)
    sd_um = _sd_at_um(fit, 0.0, replicates)
    freedom = fit.degrees_of_freedom
    return Limits("ISO 11843-2", _t_95(freedom) * sd_um, _shift_seen(freedom) * sd_um, LOQ_K * sd_um)


def hubaux_vos(fit: LineFit, replicates: int = 1, confidence: float = 0.95) -> Limits:
    """Where the line's prediction bands part (Hubaux & Vos, Anal. Chem. 42 (1970) 849).

    confidence: one-sided, of each band. Raises DataError where the bands never part.
    """
    _refuse_without_response(fit)
    t = t_quantile(confidence, fit.degrees_of_freedom)
    critical_um = t * _sd_at_um(fit, 0.0, replicates)
    lod_um = _fixed_point(lambda at_um: critical_um + t * _sd_at_um(fit, at_um, replicates), critical_um)
    return Limits("Hubaux–Vos prediction bands", critical_um, lod_um, None)


def claimed_below_detection(lowest_um: float, lod_um: float | None, what: str = "the range") -> str | None:
    if lod_um is None or lowest_um >= lod_um:
        return None
    return f"{what} begins at {lowest_um:g} µM, below the detection limit of {lod_um:.2g} µM"


def _k_sigma(whose: str, sd_na: float, sensitivity_na_um: float, k: float) -> Limits:
    _refuse_unless_positive(sd_na, sensitivity_na_um)
    sd_um = sd_na / sensitivity_na_um
    return Limits(f"{k:g} × {whose} / sensitivity", None, k * sd_um, LOQ_K * sd_um)


def _sd_at_um(fit: LineFit, at_um: float, replicates: int) -> float:
    """Standard deviation, in µM, between a new mean of `replicates` and the line at `at_um`."""
    line = (0.0 if fit.through_zero else 1 / fit.n_points) + (at_um - fit.centre_um) ** 2 / fit.spread_um2
    return fit.residual_sd_na / fit.slope_na_um * math.sqrt(1 / replicates + line)


def _t_95(freedom: int | None) -> float:
    return Z_95 if freedom is None else t_quantile(0.95, freedom)


def _shift_seen(freedom: int | None) -> float:
    """δ: how many standard deviations from zero a value must lie to be missed with 5 % odds only."""
    if freedom is None:
        return 2 * Z_95
    from scipy.special import nctdtrinc

    return float(nctdtrinc(freedom, 0.05, _t_95(freedom)))


def _fixed_point(step: Callable[[float], float], start: float) -> float:
    at = start
    for _ in range(500):
        before, at = at, step(at)
        if abs(at - before) <= 1e-14 * at:
            return at
    raise DataError("the prediction bands never part: the line is too uncertain for a detection limit")


def _refuse_unless_positive(sd_na: float, sensitivity_na_um: float) -> None:
    for name, value in (("standard deviation", sd_na), ("sensitivity", sensitivity_na_um)):
        if not (math.isfinite(value) and value > 0):
            raise InputError(f"the {name} is {value:g}; a detection limit needs one above zero")


def _refuse_without_response(fit: LineFit) -> None:
    if not tells_from_zero(fit.slope_na_um, fit.slope_se_na_um, fit.degrees_of_freedom):
        raise DataError(
            f"the slope {fit.slope_na_um:.3g} ± {fit.slope_se_na_um:.3g} nA/µM isn't a response "
            "told from zero: no limit can be had from this line",
            "measure more concentrations, or higher ones",
        )
