"""A unit that nobody has calibrated yet is forecast as its cohort, and no better."""

from dataclasses import replace

import numpy as np

from electrolog.fouling.cohort import fit_cohort
from electrolog.fouling.events import EXPOSURE, RENEWAL
from electrolog.fouling.forecast import posterior
from tests.fouling.test_lonely_days import UNITS, lonely_lab


def test_an_unread_unit_fouls_as_its_cohort_does() -> None:
    events, _ = lonely_lab(1)
    fit = fit_cohort(events)
    unread = replace(
        events,
        unit=np.array([0]),
        kind=np.array([EXPOSURE], dtype=np.int8),
        which=np.array([0]),
        amount=np.array([3.0]),
        se=np.array([np.nan]),
        units=("new",),
        groups={name: (values[0],) for name, values in events.groups.items()},
    )
    alone = posterior(fit, unread)
    lost = alone.log_sensitivity(np.array([[0.0]])) - alone.log_sensitivity(np.array([[4.0]]))
    cohort = posterior(fit, events)
    usual = cohort.log_sensitivity(np.zeros((UNITS, 1))) - cohort.log_sensitivity(np.full((UNITS, 1), 4.0))
    assert np.isfinite(lost).all()
    assert 0.5 < np.median(lost) / np.median(usual) < 2.0
    now = alone.log_sensitivity(np.array([[0.0]]))
    assert np.quantile(now, 0.95) - np.quantile(now, 0.05) > 0.8  # levels differ by sd 0.4 from probe to probe


def test_a_unit_without_any_event_is_a_fresh_probe() -> None:
    events, _ = lonely_lab(1)
    fit = fit_cohort(events)
    empty = {"unit": np.zeros(0, int), "kind": np.zeros(0, np.int8), "which": np.zeros(0, int)}
    nothing = replace(
        events,
        **empty,
        amount=np.zeros(0),
        se=np.zeros(0),
        units=("new",),
        groups=dict.fromkeys(events.groups, ("",)),
    )
    assert np.isfinite(posterior(fit, nothing).log_sensitivity(np.array([[4.0]]))).all()


def test_a_cleaning_now_turns_the_clock_back_as_a_logged_one_does() -> None:
    events, _ = lonely_lab(1)
    fit = fit_cohort(events)
    ends = np.searchsorted(events.unit, np.arange(UNITS), side="right")
    cleaned = replace(
        events,
        unit=np.insert(events.unit, ends, np.arange(UNITS)),
        kind=np.insert(events.kind, ends, RENEWAL),
        which=np.insert(events.which, ends, 0),
        amount=np.insert(events.amount, ends, 0.0),
        se=np.insert(events.se, ends, np.nan),
    )
    later = np.full((UNITS, 1), 4.0)
    logged = posterior(fit, cleaned).log_sensitivity(later)
    asked = posterior(fit, events).renewed("clean:isopropanol").log_sensitivity(later)
    assert np.abs(np.median(logged, axis=1) - np.median(asked, axis=1)).max() < 1e-6
    assert (np.median(asked, axis=1) >= np.median(posterior(fit, events).log_sensitivity(later), axis=1)).all()
