"""Kaplan–Meier and the log-rank test against R's survival package, on data sets that name their own source."""

import csv
import json
from pathlib import Path

import numpy as np
import pytest

from electrolog.errors import InputError
from electrolog.judge.survival import log_rank, survival

FOLDER = Path(__file__).parent.parent / "reference" / "survival"
RESULTS = json.loads((FOLDER / "survival_results.json").read_text(encoding="utf-8"))
# file, columns of time, loss and group, the prefix of R's strata, the key of its results
SETS = [
    ("gehan_leukaemia", "time", "status", "treat", "gehan"),
    ("lung", "time", "status", "sex", "lung_sex"),
    ("veteran_trt", "time", "status", "trt", "veteran_trt"),
    ("aml", "time", "status", "x", "aml"),
    ("ovarian", "futime", "fustat", "rx", "ovarian_rx"),
]


def rows(name):
    lines = (FOLDER / f"{name}.csv").read_text(encoding="utf-8").splitlines()
    return list(csv.DictReader(line for line in lines if not line.startswith("#")))


def groups(name, time, lost, group):
    found = {}
    for row in rows(name):
        times, ends = found.setdefault(f"{group}={row[group]}", ([], []))
        times.append(float(row[time]))
        ends.append(row[lost] == "1")
    return found


def number(text):
    return float(text) if text not in ("", "NA") else np.nan


@pytest.mark.parametrize(("name", "time", "lost", "group", "key"), SETS)
def test_the_curve_and_its_band_are_those_of_r(name, time, lost, group, key):
    """R 4.2.2, survival 3.5-3: survfit(Surv(time, status) ~ group, conf.type = "log-log")."""
    for stratum, pair in groups(name, time, lost, group).items():
        expected = [row for row in rows(f"{name}_km") if row["strata"] == stratum]
        curve = survival(*pair)
        assert curve.time == pytest.approx([number(row["time"]) for row in expected])
        assert curve.at_risk.tolist() == [int(row["n.risk"]) for row in expected]
        assert curve.lost.tolist() == [int(row["n.event"]) for row in expected]
        assert curve.alive == pytest.approx([number(row["surv"]) for row in expected], rel=1e-10)
        inside = [0 < number(row["surv"]) < 1 for row in expected]
        for ours, theirs in ((curve.low, "lower_loglog"), (curve.high, "upper_loglog")):
            values = np.array([number(row[theirs]) for row in expected])
            assert ours[inside] == pytest.approx(values[inside], rel=1e-8, nan_ok=True)


@pytest.mark.parametrize(("name", "time", "lost", "group", "key"), SETS)
def test_the_medians_are_those_of_r(name, time, lost, group, key):
    (medians,) = [row for row in RESULTS[key]["medians"] if row["_row"] == "median"]
    for stratum, pair in groups(name, time, lost, group).items():
        assert survival(*pair).median == medians[stratum]


@pytest.mark.parametrize(("name", "time", "lost", "group", "key"), SETS)
def test_the_log_rank_test_is_that_of_r(name, time, lost, group, key):
    """R 4.2.2, survival 3.5-3: survdiff(Surv(time, status) ~ group)."""
    expected = RESULTS[key]["logrank"]
    found = log_rank(groups(name, time, lost, group))
    assert found.chi_square == pytest.approx(expected["chisq"], rel=1e-9)
    assert found.p == pytest.approx(expected["p"], rel=1e-8)
    assert sorted(found.expected) == pytest.approx(sorted(expected["expected"]), rel=1e-9)


def test_four_groups_at_once_as_in_r():
    found = log_rank(groups("veteran_trt", "time", "status", "celltype"))
    expected = RESULTS["veteran_celltype"]
    assert found.degrees_of_freedom == expected["df"]
    assert found.chi_square == pytest.approx(expected["logrank_chisq"], rel=1e-9)


def test_the_worm_lifetimes_of_walton_as_in_lifelines():
    """lifelines 0.30.3, which ships the data set."""
    pairs = groups("waltons", "T", "E", "group")
    assert log_rank(pairs).chi_square == pytest.approx(RESULTS["waltons"]["logrank_miR137_vs_control"], rel=1e-9)
    both = [np.concatenate([pair[part] for pair in pairs.values()]) for part in (0, 1)]
    assert survival(*both).median == RESULTS["waltons"]["median_all"]


def test_scipys_own_two_group_test_agrees():
    from scipy.stats import CensoredData, logrank

    pairs = [tuple(map(np.array, pair)) for pair in groups("aml", "time", "status", "x").values()]
    theirs = logrank(*(CensoredData(uncensored=t[e], right=t[~e]) for t, e in pairs))
    assert log_rank(pairs).chi_square == pytest.approx(theirs.statistic**2, rel=1e-9)


def test_the_ones_still_in_use_lift_the_curve():
    everyone = survival([10, 20, 30, 40], [True] * 4)
    kept = survival([10, 20, 30, 40], [True, False, True, False])
    assert (everyone.at(35), kept.at(35)) == (0.25, pytest.approx(0.375))
    assert kept.at(5) == 1.0


def test_nothing_lost_yet_has_no_median():
    curve = survival([10, 20], [False, False])
    assert (curve.median, curve.median_low, curve.at(20)) == (None, None, 1.0)


@pytest.mark.parametrize("pair", [([], []), ([1.0], [True, False]), ([-1.0], [True]), ([np.nan], [True])])
def test_what_can_not_be_a_lifetime_is_refused(pair):
    with pytest.raises(InputError):
        survival(*pair)


def test_one_group_is_no_comparison():
    with pytest.raises(InputError, match="at least two"):
        log_rank([([1.0], [True])])
