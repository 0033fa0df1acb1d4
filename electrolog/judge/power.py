"""How many probes a clear answer takes: 80 % power in a two-sided test at 5 %. None: no number would do."""

from __future__ import annotations

import math

POWER, LEVEL = 0.8, 0.05
SMALLEST_EFFECT = 0.01  # a hundredth of a standard deviation: no lab makes the 150,000 probes


def probes_for_mean(effect: float) -> int | None:
    """Per group, for a difference of that many standard deviations between two means (noncentral t)."""
    if not effect >= SMALLEST_EFFECT:
        return None
    # Normal quantiles ask for a little less than Student's: from there it is a few steps up.
    count = max(2, math.floor(2 * (_both_quantiles() / effect) ** 2))
    while _power_of_t(effect, count) < POWER:
        count += 1
    return count


def _power_of_t(effect: float, count: int) -> float:
    from scipy.special import nctdtr, stdtrit

    freedom, shift = 2 * count - 2, effect * math.sqrt(count / 2)
    critical = float(stdtrit(freedom, 1 - LEVEL / 2))
    return 1 - float(nctdtr(freedom, shift, critical)) + float(nctdtr(freedom, shift, -critical))


def probes_for_shares(first: float, second: float) -> int | None:
    """Per group, for two shares: arcsine transform (Cohen, Statistical Power Analysis, 1988, chapter 6)."""
    apart = 2 * abs(math.asin(math.sqrt(first)) - math.asin(math.sqrt(second)))
    return None if apart < SMALLEST_EFFECT else math.ceil(2 * (_both_quantiles() / apart) ** 2)


def losses_for_lives(log_ratio: float) -> int | None:
    """Losses in two groups of equal size together: D. Schoenfeld, Biometrika 68 (1981) 316."""
    return None if abs(log_ratio) < SMALLEST_EFFECT else math.ceil(4 * (_both_quantiles() / log_ratio) ** 2)


def more(needed: int | None, there: int) -> int | None:
    return None if needed is None else max(0, needed - there)


def _both_quantiles() -> float:
    from scipy.special import ndtri

    return float(ndtri(1 - LEVEL / 2)) + float(ndtri(POWER))
