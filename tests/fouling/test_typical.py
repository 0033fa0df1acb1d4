"""The typical probe's loss: that of a lab whose shape and rate are known, and of one piece with the half-lives told."""

from __future__ import annotations

import numpy as np
import pytest

from electrolog.fouling.cohort import fit_cohort
from electrolog.fouling.events import READING
from electrolog.fouling.fit import CohortFit
from electrolog.fouling.typical import typical_loss
from tests.fouling.fleets.simulate import fleet, walk


@pytest.fixture(scope="module")
def fit() -> CohortFit:
    return fit_cohort(fleet("cleanings", 3, 80).events)


def test_a_kinds_half_life_is_where_its_loss_reaches_one_half(fit: CohortFit) -> None:
    assert fit.summary["half_lives"]
    for row in fit.summary["half_lives"]:
        at = np.array([row["low"], row["median"], row["high"]], dtype=float)
        loss = typical_loss(fit, row["coating"], row["waveform"], at)
        found = [loss.low[0], loss.median[1], loss.high[2]]
        assert found == pytest.approx([0.5, 0.5, 0.5], abs=0.02)


def test_nothing_is_lost_at_first_and_nothing_comes_back(fit: CohortFit) -> None:
    hours = np.linspace(0.0, 40.0, 21)
    row = fit.summary["half_lives"][0]
    loss = typical_loss(fit, row["coating"], row["waveform"], hours)
    for share in (loss.low, loss.median, loss.high, *loss.by_shape.values()):
        assert share[0] == pytest.approx(1.0)
        assert (np.diff(share) <= 1e-12).all()
    assert ((loss.low <= loss.median) & (loss.median <= loss.high)).all()


def test_only_shapes_of_the_fit_are_told_and_those_with_most_weight_are_there(fit: CohortFit) -> None:
    loss = typical_loss(fit, "none", "", np.array([1.0]))
    assert set(loss.by_shape) <= set(fit.shape_weights)
    assert max(fit.shape_weights, key=lambda name: fit.shape_weights[name]) in loss.by_shape


def test_a_coating_never_seen_is_still_answered(fit: CohortFit) -> None:
    loss = typical_loss(fit, "a film of tomorrow", "a waveform of tomorrow", np.array([0.0, 5.0]))
    assert np.isfinite([loss.low, loss.median, loss.high]).all()


def test_how_far_the_clock_was_ever_read_is_told(fit: CohortFit) -> None:
    """Beside the true clock: what its weights and recoveries are learned to be is close to them."""
    known = fleet("cleanings", 3, 80)
    clock_h = walk(known.truth.generator, known.events).clock_h[known.events.kind == READING]
    assert fit.summary["longest_hours"] == pytest.approx(clock_h.max(), rel=0.1)
