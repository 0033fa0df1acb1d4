"""A backtest of known truth: one method whose forecasts are honest, one that is too sure of itself."""

from __future__ import annotations

import numpy as np

from electrolog.answers.backtesting import Backtest
from electrolog.judge.backtest import Predictive, Scored, score

READINGS, DRAWS = 400, 401


def backtest() -> Backtest:
    rng = np.random.default_rng(5)
    truth = rng.normal(0.0, 1.0, READINGS)
    return Backtest(
        "dopamine", (), (_method("honest", 1.0, truth, rng), _method("sure", 0.4, truth, rng)), None, "none", (), ()
    )


def _method(name: str, spread: float, truth: np.ndarray, rng: np.random.Generator) -> Scored:
    draws = rng.normal(0, spread, (READINGS, DRAWS))
    return score(name, Predictive(draws, np.full(draws.shape, 1e-6)), truth)
