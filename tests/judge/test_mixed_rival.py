"""The linear mixed model of the backtest beside a reference library, and where it can't be fitted."""

from __future__ import annotations

import numpy as np
import pytest
from statsmodels.regression.mixed_linear_model import MixedLM

from electrolog.judge.backtest import Past, Targets, last_value, score
from electrolog.judge.mixed_rival import linear_mixed


def lines(n_units: int, seed: int = 2) -> tuple[Past, np.ndarray]:
    """Units read four times each along lines of their own, and the lines' levels and slopes."""
    rng = np.random.default_rng(seed)
    unit = np.repeat(np.arange(n_units), 4)
    own = np.column_stack([rng.normal(2.0, 0.4, n_units), rng.normal(-0.05, 0.02, n_units)])
    hours = np.cumsum(rng.uniform(1.0, 6.0, (n_units, 4)), axis=1).ravel()
    reading = own[unit, 0] + own[unit, 1] * hours + rng.normal(0.0, 0.05, len(unit))
    return Past(unit, np.zeros(len(unit), dtype=np.int64), hours, reading), own


def next_of(past: Past, hours: float, kind: int = 0) -> Targets:
    """Every unit's reading so many hours after its last."""
    own_hours, own_reading = past.hours.reshape(-1, 4), past.reading.reshape(-1, 4)
    return Targets(np.full(len(own_hours), kind), own_hours[:, -1] + hours, own_hours, own_reading)


def test_predictions_are_the_reference_librarys() -> None:
    past, _ = lines(60)
    design = np.column_stack([np.ones(len(past.hours)), past.hours / 10.0])
    fit = MixedLM(past.reading, design, past.unit, exog_re=design).fit(reml=True)
    random = np.stack([fit.random_effects[unit] for unit in range(60)])
    asked = next_of(past, 8.0)
    wanted = ((fit.fe_params + random) * np.column_stack([np.ones(60), asked.hours / 10.0])).sum(axis=1)
    assert linear_mixed(past, asked).centre[:, 0] == pytest.approx(wanted, abs=2e-4)


def test_what_it_promises_of_straight_lines_holds() -> None:
    past, own = lines(400)
    asked = next_of(past, 8.0)
    rng = np.random.default_rng(7)
    reading = own[:, 0] + own[:, 1] * asked.hours + rng.normal(0.0, 0.05, 400)
    found = linear_mixed(past, asked)
    held = [one.share for one in score("", found, reading).coverage]
    assert held == pytest.approx([0.45, 0.78, 0.90], abs=0.05)  # a Student's t of the model's standard deviation
    assert np.std(reading - found.centre[:, 0]) < 0.7 * np.std(reading - last_value(past, asked).centre[:, 0])


def test_readings_that_came_after_the_fit_count_too() -> None:
    past, _ = lines(40)
    asked = next_of(past, 8.0)
    lower = Targets(asked.kind, asked.hours, asked.own_hours, asked.own_reading - [0.0, 0.0, 0.0, 0.2])
    assert np.all(linear_mixed(past, lower).centre < linear_mixed(past, asked).centre)


def test_waveforms_have_lines_of_their_own() -> None:
    past, _ = lines(40)
    other = Past(past.unit + 40, past.kind + 1, past.hours, past.reading + 3.0)
    both = Past(*(np.concatenate(pair) for pair in zip(vars(past).values(), vars(other).values(), strict=True)))
    unread = Targets(np.array([0, 1]), np.full(2, 5.0), np.full((2, 1), 1.0), np.full((2, 1), np.nan))
    low, high = linear_mixed(both, unread).centre[:, 0]
    assert high - low == pytest.approx(3.0, abs=1e-6)


def test_the_last_value_stands_where_the_past_is_too_small_or_of_another_waveform() -> None:
    few, many = lines(3)[0], lines(40)[0]
    for past, kind in ((few, 0), (many, 1)):
        asked = next_of(past, 8.0, kind)
        found, plain = linear_mixed(past, asked), last_value(past, asked)
        assert np.array_equal(found.centre, plain.centre)
        assert np.array_equal(found.sd, plain.sd)
