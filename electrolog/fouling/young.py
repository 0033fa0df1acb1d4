"""A young cohort hardly knows its hyper-parameters, and what its days and means are depends on them.

So each draw of theta is settled by itself, with shared effects of its own, and kept as a fit of its own. Draws
come from
Laplace's approximation made a little wider, for its tails are too thin. Weighing them by importance was tried: with a
dozen hyper-parameters and some fifty draws the weights were noise, and intervals held less.
"""

from __future__ import annotations

from copy import deepcopy

import numpy as np

from electrolog.fouling.ascend import Peak, Width, log_posterior
from electrolog.fouling.points import normal_points
from electrolog.fouling.propagation import Problem

WIDER = 1.15


def settled_draws(problem: Problem, peak: Peak, width: Width, count: int) -> list[Peak]:
    """Peaks at draws of theta; a draw that cannot be settled is left out."""
    root = np.linalg.cholesky(width.covariance)
    found = []
    for z in normal_points(count, len(peak.theta)):
        state = deepcopy(peak.state)
        theta = peak.theta + WIDER * root @ z
        try:
            value, _, outcome = log_posterior(problem, theta, state, 12)
        except np.linalg.LinAlgError:
            continue
        found.append(Peak(theta, value, state, outcome, peak.converged, peak.rough_covariance))
    return found or [peak]
