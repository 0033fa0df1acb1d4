"""Many shared effects solved thinly, against the whole matrix."""

from __future__ import annotations

import numpy as np
import pytest

from electrolog.fouling.effects import Effects
from electrolog.fouling.shared import MOST_DENSE, Assembly, solve, solve_exactly

DAYS = MOST_DENSE + 50


def test_mean_and_log_determinant_are_those_of_the_whole_matrix() -> None:
    """Days that touch a few others weakly, and one level that all share: couplings count to second order."""
    rng = np.random.default_rng(2)
    n = DAYS + 1
    coupled = np.zeros((n, n))
    for day in range(1, n):
        for other in rng.integers(1, n, 5):
            if other != day:
                coupled[day, other] = coupled[other, day] = rng.choice((-0.1, 0.1))
    coupled[0, 1:] = coupled[1:, 0] = 0.05
    coupled[0, 0] = 20.0
    row, column = np.nonzero(coupled)
    plan = Assembly((), row, column)
    names = (("level",), *(("day", str(day)) for day in range(DAYS)))
    effects = Effects(names, np.zeros(n), np.full(n, np.inf), np.full(n, -2))
    prior, pull = np.concatenate([[1.0], rng.uniform(2, 4, DAYS)]), rng.normal(size=n)
    thin = solve(effects, plan, coupled[row, column], prior, pull)
    whole = solve_exactly(plan, coupled[row, column], prior, pull)
    assert thin.mean == pytest.approx(whole.mean, abs=1e-5)
    _, log_det = np.linalg.slogdet(coupled + np.diag(prior))
    assert whole.half_log_det == pytest.approx(0.5 * log_det)
    assert thin.half_log_det == pytest.approx(0.5 * log_det, abs=0.1)
    coarse = 0.5 * np.log(np.diag(coupled) + prior).sum()  # what it would be without couplings: far off
    assert abs(coarse - 0.5 * log_det) > 1.0
