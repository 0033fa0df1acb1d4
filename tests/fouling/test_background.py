"""A background that tells of the sensitivity is found out and used; one that doesn't is left alone."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from scipy import stats

from electrolog.fouling.background import Law, Pairs, resampled, tried

PROBES, EACH, DRAWS, SPREAD, READING_SD = 30, 2, 512, 0.15, 0.03


def pairs(slope: float, background_sd: float, seed: int, probes: int = PROBES) -> Pairs:
    """Changes of log S forecast no better than they scatter, beside a background that follows them by `slope`."""
    rng = np.random.default_rng(seed)
    count = probes * EACH
    mean = rng.normal(-0.3, 0.05, count)
    truth = mean + rng.normal(0.0, SPREAD, count)
    forecast = mean[:, None] + SPREAD * stats.norm.ppf((rng.permutation(DRAWS) + 0.5) / DRAWS)
    background = 0.01 + slope * truth + rng.normal(0.0, background_sd, count)
    reading = truth + rng.normal(0.0, READING_SD, count)
    return Pairs(forecast, reading, truth, np.full(DRAWS, READING_SD), background, np.repeat(np.arange(probes), EACH))


def test_a_background_that_follows_the_sensitivity_is_found_out() -> None:
    found = tried(pairs(0.4, 0.02, seed=1))
    assert found.law is not None
    assert found.law.slope == pytest.approx(0.4, abs=0.05)
    assert found.better > 3 * found.better_se
    assert "sharpens" in found.said


def test_one_that_tells_nothing_is_hardly_ever_taken() -> None:
    """One chance in twenty by design; of forty such labs no more than six, which by chance happens once in 70."""
    taken = sum(tried(pairs(0.0, 0.02, seed)).law is not None for seed in range(40))
    assert taken <= 6


def test_too_few_pairs_are_said_to_be_too_few() -> None:
    found = tried(pairs(0.4, 0.02, seed=1, probes=7))
    assert found.law is None
    assert "14 pairs of 7 probes" in found.said


def test_a_slip_among_the_readings_teaches_no_law() -> None:
    clean = pairs(0.4, 0.02, seed=2)
    reading, smoothed = clean.reading.copy(), clean.smoothed.copy()
    reading[5] -= np.log(1000.0)
    smoothed[5] -= np.log(1000.0)
    slipped = replace(clean, reading=reading, smoothed=smoothed)
    found, before = tried(slipped), tried(clean)
    assert found.law is not None
    assert before.law is not None
    assert found.law.slope == pytest.approx(before.law.slope, abs=0.02)


def test_what_is_left_is_the_normals_product() -> None:
    """Prior N(-0.3, 0.15²) and a background that says -0.1 ± 0.05: their product, by the textbook."""
    draws = -0.3 + 0.15 * stats.norm.ppf((np.arange(20_000) + 0.5) / 20_000)
    law = Law(intercept=0.02, slope=0.5, sd=0.025)
    kept = draws[resampled(law, draws, 0.02 + 0.5 * -0.1)]
    weight = 0.15**-2 + 0.05**-2
    assert kept.mean() == pytest.approx((-0.3 * 0.15**-2 - 0.1 * 0.05**-2) / weight, abs=1e-3)
    assert kept.std() == pytest.approx(weight**-0.5, rel=0.02)


@pytest.mark.parametrize(("count", "enough"), [(20, True), (19, False)])
def test_twenty_pairs_are_enough(count: int, enough: bool) -> None:
    every = pairs(0.4, 0.02, seed=1, probes=10)
    some = {name: getattr(every, name)[:count] for name in ("forecast", "reading", "smoothed", "background", "probe")}
    assert ("are needed" in tried(replace(every, **some)).said) is not enough
