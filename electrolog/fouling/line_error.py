"""How far to trust the standard error that a calibration line gave for its own slope.

Five points tell a line's error with three degrees of freedom: a small one is mostly luck, and one that stands for much
more than it is. Each is drawn toward what is typical of the lab, by as much as the lab's own spread of them says
(moderated variances: Smyth 2004, doi:10.2202/1544-6115.1027). An unknown one is taken as typical.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]
LINE_DF = 3.0  # of a line through five points; common practice in the trade, and the record may not say
MOST_PRIOR_DF = 100.0


@dataclass(frozen=True)
class LineError:
    """The lab's typical variance of log sensitivity from a line's own error, and how many degrees of freedom that
    is worth."""

    typical_variance: float
    prior_df: float

    def moderated(self, se: Floats) -> Floats:
        """Variance of each reading from its standard error (NaN unknown)."""
        known = np.isfinite(se)
        own = np.where(known, se, 0.0) ** 2
        drawn = (self.prior_df * self.typical_variance + LINE_DF * own) / (self.prior_df + LINE_DF)
        return np.where(known, drawn, self.typical_variance)


def learn_line_error(se: Floats) -> LineError:
    """From the mean and variance of log se^2, as if true variances were scaled inverse chi-squared."""
    from scipy.special import digamma

    log_variance = np.log(se[np.isfinite(se) & (se > 0.0)] ** 2)
    if len(log_variance) == 0:
        return LineError(0.0, MOST_PRIOR_DF)
    prior_df = spread_to_df(float(np.var(log_variance)), len(log_variance))
    half_line, half_prior = LINE_DF / 2.0, prior_df / 2.0
    log_typical = (
        log_variance.mean() - digamma(half_line) + np.log(half_line) + digamma(half_prior) - np.log(half_prior)
    )
    return LineError(float(np.exp(log_typical)), prior_df)


def spread_to_df(variance: float, count: int) -> float:
    """Solve trigamma(prior_df / 2) = variance of log se^2 beyond what three degrees of freedom explain."""
    from scipy.special import polygamma

    if count < 5:
        return LINE_DF
    beyond = variance * count / (count - 1) - float(polygamma(1, LINE_DF / 2.0))
    low, high = 0.5, MOST_PRIOR_DF
    for _ in range(60):
        middle = np.sqrt(low * high)
        low, high = (middle, high) if float(polygamma(1, middle / 2.0)) > beyond else (low, middle)
    return float(np.sqrt(low * high))
