"""Slips of the hand that a new calibration may hold: each judge gives one plain sentence, or None.

They compare with the past (the probe's own, or where it has none its cohort's): median of earlier
sensitivities with the same analyte and waveform, and the concentrations used before. A slip is asked about,
never corrected.
"""

from __future__ import annotations

import math
from collections.abc import Sequence

import numpy as np
from numpy.typing import ArrayLike, NDArray

from electrolog.measure.line import fit_line, levels_um
from electrolog.measure.tails import t_quantile

Array = NDArray[np.float64]

DECIMAL = 0.15  # how near, in decades, a ratio must be to a power of ten to look like a slipped decimal
THOUSAND = 0.5  # the same for a prefix: nothing else moves a sensitivity so far
UNSEEN_FALL = 0.05  # of the largest current: what two injections may differ by anyway (common practice)


def likely_slips(
    concentration_um: ArrayLike,
    current_na: ArrayLike,
    sensitivity_na_um: float | None,
    *,
    earlier_sensitivity_na_um: Sequence[float] = (),
    earlier_concentration_um: Sequence[float] = (),
    noise_na: float | None = None,
) -> tuple[str, ...]:
    """Every likely slip of one calibration; points (n,) may be empty where only a factor was typed."""
    x, y = np.asarray(concentration_um, dtype=float), np.asarray(current_na, dtype=float)
    said = (
        nanomolar_as_micromolar(x, earlier_concentration_um),
        thousandfold(sensitivity_na_um, earlier_sensitivity_na_um),
        inverse_factor(sensitivity_na_um, earlier_sensitivity_na_um),
        tenfold(sensitivity_na_um, earlier_sensitivity_na_um),
        wrong_sign(x, y),
        reversed_order(x, y, noise_na),
    )
    return tuple(text for text in said if text)


def thousandfold(sensitivity_na_um: float | None, earlier_na_um: Sequence[float]) -> str | None:
    decades = _decades(sensitivity_na_um, earlier_na_um)
    if abs(abs(decades) - 3) > THOUSAND:
        return None
    return _apart(sensitivity_na_um, earlier_na_um, "is one of the units off by 1000 (pA and nA, nM and µM)?")


def tenfold(sensitivity_na_um: float | None, earlier_na_um: Sequence[float]) -> str | None:
    decades = _decades(sensitivity_na_um, earlier_na_um)
    if abs(abs(decades) - 1) > DECIMAL and abs(abs(decades) - 2) > DECIMAL:
        return None
    return _apart(sensitivity_na_um, earlier_na_um, "did a decimal point slip?")


def inverse_factor(sensitivity_na_um: float | None, earlier_na_um: Sequence[float]) -> str | None:
    """µM/nA typed as nA/µM. Where the usual sensitivity is near one the two can't be told apart."""
    decades, usual = _decades(sensitivity_na_um, earlier_na_um), _usual(earlier_na_um)
    if sensitivity_na_um is None or usual is None or abs(decades) < 0.5:
        return None
    if abs(math.log10(abs(sensitivity_na_um) * usual)) > DECIMAL:
        return None
    return (
        f"the sensitivity {_plain(sensitivity_na_um)} nA/µM is nearly 1/{_plain(usual)}, the inverse of "
        f"the usual {_plain(usual)} nA/µM: was it typed in µM/nA?"
    )


def nanomolar_as_micromolar(concentration_um: ArrayLike, earlier_um: Sequence[float]) -> str | None:
    """The highest concentration against the highest used before."""
    x = np.asarray(concentration_um, dtype=float)
    above, usual = x[x > 0], max((value for value in earlier_um if value > 0), default=None)
    if usual is None or not above.size:
        return None
    decades = math.log10(float(above.max()) / usual)
    if abs(abs(decades) - 3) > THOUSAND:
        return None
    guess = "nM typed as µM" if decades > 0 else "µM typed as nM, or mM as µM"
    return f"the concentrations reach {above.max():g} µM, and {usual:g} µM at most before: {_times(decades)}; {guess}?"


def wrong_sign(concentration_um: ArrayLike, current_na: ArrayLike) -> str | None:
    x, y = np.asarray(concentration_um, dtype=float), np.asarray(current_na, dtype=float)
    if not (x > 0).any() or not (y[x > 0] < 0).all():
        return None
    return (
        f"every current above zero concentration is negative ({y[x > 0].min():g} to {y[x > 0].max():g} nA): "
        "is oxidation recorded as negative current?"
    )


def reversed_order(concentration_um: ArrayLike, current_na: ArrayLike, noise_na: float | None = None) -> str | None:
    """A concentration whose mean current lies below that of a lower one, beyond what scatter allows.

    Scatter: that of the replicates (95 %) or three times the noise, whichever is more, and a fall of less than
    5 % of the largest current is never asked about.
    """
    x, y = np.asarray(concentration_um, dtype=float), np.asarray(current_na, dtype=float)
    levels = levels_um(x)
    if len(levels) < 2:
        return None
    upright = -y if fit_line(x, y).slope_na_um < 0 and wrong_sign(x, y) else y
    mean_na = np.array([upright[x == level].mean() for level in levels])
    count = np.array([(x == level).sum() for level in levels])
    for i in range(1, len(levels)):
        before = int(np.argmax(mean_na[:i]))
        fall_na = mean_na[before] - mean_na[i]
        if fall_na > _scatter_na(upright, mean_na, x, levels, noise_na) * math.sqrt(1 / count[i] + 1 / count[before]):
            return (
                f"the current falls from {y[x == levels[before]].mean():g} nA at {levels[before]:g} µM to "
                f"{y[x == levels[i]].mean():g} nA at {levels[i]:g} µM, beyond scatter: are two points swapped?"
            )
    return None


def _scatter_na(y: Array, mean_na: Array, x: Array, levels: Array, noise_na: float | None) -> float:
    """How far one point may stray; a difference of two points may be √2 times as large."""
    freedom, within_na = len(x) - len(levels), 0.0
    if freedom > 0:
        pooled_na2 = float(((y - mean_na[np.searchsorted(levels, x)]) ** 2).sum()) / freedom
        within_na = t_quantile(0.975, freedom) * math.sqrt(pooled_na2)
    return max(within_na, 3 * (noise_na or 0.0), UNSEEN_FALL * float(np.abs(y).max()) / math.sqrt(2))


def _usual(earlier: Sequence[float]) -> float | None:
    known = sorted(value for value in earlier if math.isfinite(value) and value > 0)
    if not known:
        return None
    return math.sqrt(known[(len(known) - 1) // 2] * known[len(known) // 2])


def _decades(value: float | None, earlier: Sequence[float]) -> float:
    """log10 of |value| over what is usual; 0 where nothing can be compared."""
    usual = _usual(earlier)
    if value is None or usual is None or value == 0 or not math.isfinite(value):
        return 0.0
    return math.log10(abs(value) / usual)


def _apart(value_na_um: float | None, earlier: Sequence[float], question: str) -> str | None:
    usual = _usual(earlier)
    if value_na_um is None or usual is None:
        return None
    times = _times(_decades(value_na_um, earlier))
    return f"the sensitivity {_plain(value_na_um)} nA/µM is {times} the usual {_plain(usual)} nA/µM: {question}"


def _times(decades: float) -> str:
    return f"{_plain(10**decades)} times" if decades > 0 else f"1/{_plain(10**-decades)} of"


def _plain(value: float) -> str:
    """Three digits, and 20000 rather than 2e+04."""
    return f"{float(f'{value:.3g}'):.10g}"
