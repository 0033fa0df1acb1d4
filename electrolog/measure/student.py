"""Student's t for whole degrees of freedom, in closed form.

scipy.special has it too, but its import alone takes several times as long as everything a calibration at the
bench has to do; the tests hold these values against it.
"""

from __future__ import annotations

import math
from functools import lru_cache


def two_sided_p(t: float, degrees_of_freedom: int) -> float:
    """P(|T| > |t|): Abramowitz & Stegun (1964), 26.7.3 and 26.7.4. NaN without a degree of freedom."""
    if degrees_of_freedom < 1 or math.isnan(t):
        return math.nan
    return max(0.0, 1 - _inside(abs(t), degrees_of_freedom))


@lru_cache(maxsize=256)
def t_quantile(probability: float, degrees_of_freedom: int) -> float:
    """The t that a share `probability` (0.5 to 1) of the distribution lies below."""
    if degrees_of_freedom < 1:
        return math.nan
    t, wanted = 0.0, 2 * probability - 1
    for _ in range(200):  # from the left of a concave curve Newton's steps can't overshoot
        step = (wanted - _inside(t, degrees_of_freedom)) / (2 * _density(t, degrees_of_freedom))
        t += step
        if abs(step) <= 1e-14 * t:
            break
    return t


def _inside(t: float, freedom: int) -> float:
    angle = math.atan2(t, math.sqrt(freedom))
    cos2, odd = math.cos(angle) ** 2, freedom % 2
    term = total = math.cos(angle) if odd else 1.0
    for k in range(2 + odd, freedom - 1, 2):
        term *= cos2 * (k - 1) / k
        total += term
    if not odd:
        return math.sin(angle) * total
    return 2 / math.pi * (angle + (math.sin(angle) * total if freedom > 1 else 0.0))


def _density(t: float, freedom: int) -> float:
    half = math.lgamma((freedom + 1) / 2) - math.lgamma(freedom / 2) - 0.5 * math.log(freedom * math.pi)
    return math.exp(half - (freedom + 1) / 2 * math.log1p(t * t / freedom))
