"""A week's runs get the probes with which all of them are likeliest to succeed; brute force agrees."""

import itertools
import time
from datetime import UTC, datetime, timedelta

import numpy as np
import pytest

from electrolog.errors import InputError
from electrolog.judge.assign import PlannedRun, SuccessTable, Week, assign

MONDAY = datetime(2031, 3, 3, 9, tzinfo=UTC)


def run(label, day, hours=2.0, hour=0.0, kind="dopamine"):
    return PlannedRun(label, MONDAY + timedelta(days=day, hours=hour), hours * 60, kind)


def table(rates, level=0.99):
    """Odds that fall with wear at each probe's own rate per hour."""
    wear = np.arange(0, 2000.0, 30.0)
    return SuccessTable(wear, level * np.exp(-np.asarray(rates)[:, None] * wear / 60))


def week(runs, rates, **changed):
    probes = len(rates)
    known = {
        "tables": {"dopamine": table(rates)},
        "available": np.ones((len(runs), probes), dtype=bool),
        "uses_left": np.ones(probes, dtype=int),
        "least_success": 0.5,
    }
    return Week(runs, **{**known, **changed})


def odds_of(asked, choice):
    """Served runs and their log odds of one choice of probes, None where it isn't allowed; written anew, plainly."""
    total, served = 0.0, 0
    order = sorted(range(len(asked.runs)), key=lambda index: asked.runs[index].start)
    worn, used, busy_until = {}, {}, {}
    for index in order:
        probe, planned = choice[index], asked.runs[index]
        if probe is None:
            continue
        used[probe] = used.get(probe, 0) + 1
        if not asked.available[index, probe] or used[probe] > asked.uses_left[probe]:
            return None
        if planned.start < busy_until.get(probe, planned.start):
            return None
        busy_until[probe] = planned.end + timedelta(minutes=asked.turnaround_min)
        worn[probe] = worn.get(probe, 0.0) + planned.wear
        found = asked.tables[planned.kind]
        p = np.interp(worn[probe], found.wear_min, found.p_success[probe])
        if not p >= asked.least_success:
            return None
        served, total = served + 1, total + np.log(p)
    return served, total


def best_by_brute_force(asked):
    probes = [None, *range(asked.available.shape[1])]
    scores = (odds_of(asked, choice) for choice in itertools.product(probes, repeat=len(asked.runs)))
    return max(score for score in scores if score is not None)


def found_score(asked):
    return odds_of(asked, [place.probe for place in assign(asked)])


@pytest.mark.parametrize("seed", range(12))
def test_with_one_use_per_probe_it_is_the_optimum(seed):
    rng = np.random.default_rng(seed)
    runs = [run(str(i), int(rng.integers(5)), float(rng.uniform(1, 6)), float(rng.uniform(0, 8))) for i in range(4)]
    asked = week(runs, rng.uniform(0.005, 0.2, 5), available=rng.random((4, 5)) < 0.7)
    assert found_score(asked) == pytest.approx(best_by_brute_force(asked))


def test_with_reuse_it_is_never_worse_than_without_and_nearly_always_the_optimum():
    hits = 0
    for seed in range(12):
        rng = np.random.default_rng(100 + seed)
        runs = [run(str(i), int(rng.integers(4)), float(rng.uniform(1, 5)), float(rng.uniform(0, 6))) for i in range(5)]
        rates = rng.uniform(0.005, 0.12, 3)
        asked = week(runs, rates, uses_left=np.full(3, 3), turnaround_min=60.0)
        found, best = found_score(asked), best_by_brute_force(asked)
        assert found[0] == best[0]
        assert found >= best_by_brute_force(week(runs, rates, turnaround_min=60.0))
        hits += found[1] == pytest.approx(best[1])
    assert hits >= 11


def test_a_probe_used_on_monday_is_older_on_wednesday():
    asked = week([run("wednesday", 2), run("monday", 0)], [0.05], uses_left=np.array([2]))
    later, earlier = assign(asked)
    assert (earlier.wear_before_min, later.wear_before_min) == (0.0, 120.0)
    assert later.p_success == pytest.approx(0.99 * np.exp(-0.05 * 4), rel=1e-3)


def test_the_long_run_gets_the_slow_fouling_probe():
    long, short = assign(week([run("long", 0, 6), run("short", 0, 1)], [0.08, 0.01]))
    assert (long.probe, short.probe) == (1, 0)


def test_runs_at_the_same_time_never_share_a_probe():
    places = assign(week([run("a", 0), run("b", 0, hour=1)], [0.01], uses_left=np.array([5])))
    assert [place.probe for place in places].count(None) == 1


def test_a_long_run_keeps_its_probe_from_whatever_starts_before_it_ends():
    runs = [run("long", 0, 6), run("early", 0, 1, hour=1), run("late", 0, 1, hour=5)]
    long, early, late = assign(week(runs, [0.01], uses_left=np.array([5])))
    assert (long.probe, early.probe, late.probe) == (None, 0, 0)


def test_turnaround_keeps_two_runs_of_one_day_apart():
    runs = [run("a", 0), run("b", 0, hour=2.5)]
    assert all(place.probe == 0 for place in assign(week(runs, [0.01], uses_left=np.array([5]))))
    tight = assign(week(runs, [0.01], uses_left=np.array([5]), turnaround_min=60.0))
    assert [place.probe for place in tight].count(None) == 1


def test_an_earlier_run_never_wears_a_probe_below_what_its_later_run_needs():
    asked = week([run("monday", 0, 4), run("wednesday", 2, 4)], [0.1], uses_left=np.array([2]), least_success=0.6)
    assert [place.probe for place in assign(asked)].count(None) == 1


def test_an_unserved_run_says_what_became_of_every_probe():
    rates = [0.01, 0.4, 0.01, np.nan]
    available = np.array([[True] * 4, [True, True, False, True]])
    places = assign(week([run("a", 0, 3), run("b", 0, 3)], rates, available=available, least_success=0.8))
    assert all(place.probe is not None for place in places)
    available[0, 2] = False
    (unserved,) = [
        place
        for place in assign(week([run("a", 0, 3), run("b", 0, 3)], rates, available=available, least_success=0.8))
        if place.probe is None
    ]
    for said in (
        "1 not available then",
        "1 without a usable forecast",
        "1 below the accepted odds",
        "1 taken by other runs",
        "30 %",
    ):
        assert said in unserved.why


def test_each_kind_of_run_is_judged_by_its_own_table():
    tables = {"dopamine": table([0.01, np.nan]), "serotonin": table([np.nan, 0.01])}
    runs = [run("a", 0, kind="serotonin"), run("b", 0, kind="dopamine")]
    assert [place.probe for place in assign(week(runs, [0.01, 0.01], tables=tables))] == [1, 0]


def test_beyond_the_table_nothing_is_promised():
    short = {"dopamine": SuccessTable(np.array([0.0, 60.0]), np.array([[0.99, 0.98]]))}
    (place,) = assign(week([run("a", 0, 2)], [0.01], tables=short))
    assert place.probe is None


def test_no_runs_need_no_probes():
    assert assign(week([], [0.01], available=np.ones((0, 1), dtype=bool))) == ()


@pytest.mark.parametrize("hours", [0.0, -1.0])
def test_a_run_of_nothing_is_refused(hours):
    with pytest.raises(InputError, match="longer than zero"):
        assign(week([run("a", 0, hours)], [0.01]))


def test_an_unknown_kind_is_refused():
    with pytest.raises(InputError, match="histamine"):
        assign(week([run("a", 0, kind="histamine")], [0.01]))


@pytest.mark.parametrize("uses", [1, 3])
def test_two_hundred_runs_on_two_thousand_probes_take_less_than_two_seconds_of_work(uses):
    rng = np.random.default_rng(4)
    runs = [run(str(i), int(rng.integers(5)), float(rng.uniform(1, 6)), float(rng.integers(0, 8))) for i in range(200)]
    asked = week(runs, rng.uniform(0.001, 0.3, 2000), uses_left=np.full(2000, uses))
    began = time.process_time()
    places = assign(asked)
    assert time.process_time() - began < 2.0
    assert all(place.probe is not None for place in places)


def test_odds_are_read_between_the_tables_points_to_its_end():
    table = SuccessTable(np.array([0.0, 60.0, 120.0]), np.array([[1.0, 0.8, 0.2]]))
    wear = np.array([0.0, 30.0, 60.0, 90.0, 120.0, 121.0])
    assert table.at(np.zeros(6, dtype=int), wear) == pytest.approx([1.0, 0.9, 0.8, 0.5, 0.2, np.nan], nan_ok=True)
