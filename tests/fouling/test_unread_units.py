"""A unit that nobody has calibrated yet is forecast as its cohort, and no better."""

from dataclasses import replace

import numpy as np

from electrolog.fouling.cohort import fit_cohort
from electrolog.fouling.events import EXPOSURE
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
