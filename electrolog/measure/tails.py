"""Tails of Student's t and of Fisher's F, for p-values and intervals.

scipy.special has them too, but its import alone takes longer than everything else a calibration at the bench
has to do; the tests hold these against it.
"""

from __future__ import annotations

import math
from functools import lru_cache


def two_sided_p(t: float, degrees_of_freedom: float) -> float:
    """P(|T| > |t|). NaN without a degree of freedom."""
    if degrees_of_freedom < 1 or math.isnan(t):
        return math.nan
    if math.isinf(t):
        return 0.0
    return _beta_share(degrees_of_freedom, t * t, degrees_of_freedom / 2, 0.5)


def f_p(f: float, freedom_above: int, freedom_below: int) -> float:
    """P(F > f) for the ratio of two mean squares. NaN without degrees of freedom on both sides."""
    if min(freedom_above, freedom_below) < 1 or math.isnan(f):
        return math.nan
    return _beta_share(freedom_below, freedom_above * f, freedom_below / 2, freedom_above / 2)


@lru_cache(maxsize=256)
def t_quantile(probability: float, degrees_of_freedom: float) -> float:
    """The t that a share `probability` (0.5 to 1) of the distribution lies below."""
    if degrees_of_freedom < 1:
        return math.nan
    t, outside = 0.0, 2 * (1 - probability)
    for _ in range(200):  # from the left of a concave curve Newton's steps can't overshoot
        step = (two_sided_p(t, degrees_of_freedom) - outside) / (2 * _density(t, degrees_of_freedom))
        t += step
        if abs(step) <= 1e-14 * t:
            break
    return t


def _density(t: float, freedom: float) -> float:
    half = math.lgamma((freedom + 1) / 2) - math.lgamma(freedom / 2) - 0.5 * math.log(freedom * math.pi)
    return math.exp(half - (freedom + 1) / 2 * math.log1p(t * t / freedom))


def _beta_share(part: float, rest: float, a: float, b: float) -> float:
    """The regularised incomplete beta function I_x(a, b) at x = part/(part + rest).

    Continued fraction, NIST Digital Library of Mathematical Functions 8.17.22, from its far end inwards; on the
    side where it converges slowly the reflection 8.17.4 leads to the other. Both parts are handed over, because
    1 − x would lose the digits of a small tail.
    """
    x = part / (part + rest)
    if x == 0:
        return 0.0
    if x > (a + 1) / (a + b + 2):
        return 1 - _beta_share(rest, part, b, a)
    fraction = 1.0
    for n in range(24 + int(4 * math.sqrt(a + b)), 0, -1):
        m, odd = divmod(n, 2)
        numerator = -(a + m) * (a + b + m) if odd else m * (b - m)
        fraction = 1 + numerator * x / ((a + n - 1) * (a + n)) / fraction
    log_size = a * math.log(x) + b * math.log1p(-x) - math.log(a)
    log_beta = math.lgamma(a) + math.lgamma(b) - math.lgamma(a + b)
    return math.exp(log_size - log_beta) / fraction
