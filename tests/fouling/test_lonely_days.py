"""A small lab where most calibration days see one probe alone, with a slip of a unit: the demo lab's own design.

Nothing but the prior can tell such a day's effect from the probe, and the fit has to stay sane there: it converges,
its draws are finite, its intervals are no wider than a bench worker would laugh at.
"""

import numpy as np
import pytest

from electrolog.fouling.cohort import fit_cohort
from electrolog.fouling.events import EXPOSURE, READING, RENEWAL, Events
from electrolog.fouling.forecast import posterior

UNITS = 30
FACTORS = {
    "coating": ("none", "PFSA", "PEDOT:PFSA"),
    "fibre": ("5 um", "7 um"),
    "batch": ("B1", "B2", "B3", "B4"),
    "waveform": ("triangle",),
}


def lonely_lab(seed: int, slip: bool = True) -> tuple[Events, np.ndarray]:
    rng = np.random.default_rng(seed)
    rows, truth, days = [], [], 0
    for unit in range(UNITS):
        level, rate, hours = rng.normal(3.0, 0.4), 0.04 * np.exp(rng.normal(0, 0.4)), 0.0
        for run in range(rng.integers(1, 4)):
            for stage in range(2):
                y = level - rate * hours + rng.normal(0, 0.04)
                if slip and unit == 7 and run == 0 and stage == 1:
                    y -= np.log(1000.0)
                rows.append((unit, READING, days, y, 0.01))
                days += rng.random() < 0.8  # now and then two readings share a day
                if stage == 0:
                    length = rng.uniform(1, 5)
                    rows.append((unit, EXPOSURE, 0, length, np.nan))
                    hours += length
            if rng.random() < 0.3:
                rows.append((unit, RENEWAL, 0, 0.0, np.nan))
                hours *= 0.6
        truth.append(level - rate * (hours + 4.0))
    unit, kind, which, amount, se = (np.array(column) for column in zip(*rows, strict=True))
    groups = {name: tuple(values[unit % len(values)] for unit in range(UNITS)) for name, values in FACTORS.items()}
    events = Events(
        unit.astype(np.int64),
        kind.astype(np.int8),
        which.astype(np.int64),
        amount.astype(float),
        se.astype(float),
        tuple(f"u{k}" for k in range(UNITS)),
        ("in-vivo",),
        ("clean:isopropanol",),
        tuple(f"d{k}" for k in range(days + 1)),
        groups,
    )
    return events, np.array(truth)


@pytest.mark.parametrize("seed", [1, 2])
def test_fit_stays_sane_where_days_see_one_probe_alone(seed: int) -> None:
    events, truth = lonely_lab(seed)
    fit = fit_cohort(events)
    assert fit.converged
    draws = posterior(fit, events).log_sensitivity(np.full((UNITS, 1), 4.0))
    low, high = np.quantile(draws, [0.05, 0.95], axis=1)
    assert np.isfinite(draws).all()
    assert np.median(high - low) < 1.0
    assert (high - low).max() < 4.0
    assert np.mean((low <= truth) & (truth <= high)) > 0.75
