"""From the forecast of a shelf to a week's assignment."""

from datetime import UTC, datetime, timedelta

import numpy as np
import pytest

from electrolog.errors import InputError
from electrolog.judge.assign import PlannedRun, Week, assign
from electrolog.judge.planning import success_table
from electrolog.judge.verdict import judge
from tests.judge.known_probes import Known, fresh, limits, question, shelf_of

GRID = np.arange(0, 1200.0, 60.0)
PROBES = [Known(rate=0.08, sd=0.03), Known(rate=0.02, sd=0.03)]


def shelf(*calibrations, **changed):
    kinds = [(probe, facts, 0, "") for probe, facts in zip(PROBES, calibrations, strict=True)]
    return shelf_of(kinds, **{"limits": limits(), **changed})


def test_the_table_holds_the_odds_that_the_verdict_gives():
    table = success_table(shelf(fresh(), fresh()), GRID)
    for row, probe in enumerate(PROBES):
        for column in (2, 7):
            alone = judge(question(probe, run_min=float(GRID[column])))
            assert table.p_success[row, column] == pytest.approx(1 - alone.p_breach)


def test_two_moments_make_a_table():
    assert success_table(shelf(fresh(), fresh()), [0.0, 60.0]).p_success.shape == (2, 2)


def test_an_old_calibration_is_no_bar_for_next_week_but_none_at_all_is():
    table = success_table(shelf(fresh(age_h=100.0), None), GRID)
    assert table.p_success[0, 0] == pytest.approx(1.0)
    assert np.isnan(table.p_success[1]).all()


@pytest.mark.parametrize(
    "changed",
    [
        {"out_of_use": ["", "retired"]},
        {"uses": [0, 9], "limits": limits(most_uses=5.0)},
        {"limits": limits(highest_detection_limit=0.1)},
    ],
)
def test_a_probe_that_can_not_serve_has_no_odds(changed):
    table = success_table(shelf(fresh(), fresh(noise_na=None), **changed), GRID)
    assert np.isnan(table.p_success[1]).all()
    assert not np.isnan(table.p_success[0]).any()


def test_without_a_limit_at_the_end_nothing_is_promised():
    assert np.isnan(success_table(shelf(fresh(), fresh(), limits=limits(least_share_left=None)), GRID).p_success).all()


@pytest.mark.parametrize("grid", [[0.0], [10.0, 20.0], [0.0, 30.0, 30.0]])
def test_a_grid_that_does_not_rise_from_nothing_is_refused(grid):
    with pytest.raises(InputError, match="rise from 0"):
        success_table(shelf(fresh(), fresh()), grid)


def test_a_week_is_assigned_from_the_forecast():
    """The slow-fouling probe takes both long runs; the other one the short."""
    monday = datetime(2031, 3, 3, 9, tzinfo=UTC)
    runs = [
        PlannedRun("long", monday, 300.0, "dopamine"),
        PlannedRun("short", monday, 60.0, "dopamine"),
        PlannedRun("thursday", monday + timedelta(days=3), 300.0, "dopamine"),
    ]
    table = success_table(shelf(fresh(), fresh()), GRID)
    week = Week(runs, {"dopamine": table}, np.ones((3, 2), dtype=bool), np.array([2, 2]), least_success=0.95)
    assert [place.probe for place in assign(week)] == [1, 0, 1]
