"""Groups of probes compared: published tests, honest multiplicity, and how many more it would take."""

import numpy as np
import pytest

from electrolog.errors import InputError
from electrolog.judge import power
from electrolog.judge.compare import Groups, compare, holm

# Extra hours of sleep: Cushny & Peebles, as used by Student, Biometrika 6 (1908) 1.
SLEEP = {
    "1": [0.7, -1.6, -0.2, -1.2, -0.1, 3.4, 3.7, 0.8, 0.0, 2.0],
    "2": [1.9, 0.8, 1.1, 0.1, -0.1, 4.4, 5.5, 1.6, 4.6, 3.4],
}


def only(groups):
    (difference,) = compare(groups).differences
    return difference


def test_means_are_compared_by_welchs_test():
    """R's documented t.test(extra ~ group, data = sleep): p = 0.07939, interval -3.3654832 to 0.2054832 (memory)."""
    found = only(Groups(values={"hours": SLEEP}))
    assert found.value == pytest.approx(-1.58)
    assert (found.low, found.high) == pytest.approx((-3.3654832, 0.2054832), abs=1e-6)
    assert found.p == pytest.approx(0.07939, abs=5e-6)


def test_a_ratio_measure_is_compared_as_a_ratio_of_geometric_means():
    rng = np.random.default_rng(1)
    groups = {"PFSA": np.exp(rng.normal(2.3, 0.2, 40)), "bare": np.exp(rng.normal(2.0, 0.2, 40))}
    found = compare(Groups(values={"level": groups}, ratio_measures=("level",)))
    (difference,), (first, _) = found.differences, found.estimates
    assert difference.low < np.exp(0.3) < difference.high
    assert first.low < np.exp(2.3) < first.high
    assert first.value == pytest.approx(np.exp(np.log(groups["PFSA"]).mean()))


def test_shares_are_compared_by_newcombes_interval():
    """Newcombe, Stat. Med. 17 (1998) 873, table II, example (a), method 10: 56/70 − 48/80 is 0.0524 to 0.3339."""
    found = only(Groups(shares={"yield": {"a": (56, 70), "b": (48, 80)}}))
    assert found.value == pytest.approx(0.2)
    assert (found.low, found.high) == pytest.approx((0.0524, 0.3339), abs=5e-5)


def test_fishers_own_tea():
    """Fisher, The Design of Experiments (1935): three of four cups right; two-sided p = 34/70."""
    assert only(Groups(shares={"right": {"milk": (3, 4), "tea": (1, 4)}})).p == pytest.approx(34 / 70)


def test_lives_are_compared_by_log_rank_and_petos_ratio():
    """Peto's one-step log ratio is (O − E)/V; for the leukaemia trial of Freireich et al. (Blood 21 (1963) 699) with
    R's O − E = 9 − 19.2505 and V = 6.25696: exp(−1.6383) = 0.1943."""
    control = [1, 1, 2, 2, 3, 4, 4, 5, 5, 8, 8, 8, 8, 11, 11, 12, 12, 15, 17, 22, 23]
    treated = [6, 6, 6, 7, 10, 13, 16, 22, 23, 6, 9, 10, 11, 17, 19, 20, 25, 32, 32, 34, 35]
    lives = {"6-MP": (treated, [True] * 9 + [False] * 12), "control": (control, [True] * 21)}
    found = only(Groups(lives=lives))
    assert found.value == pytest.approx(np.exp((9 - 19.250500948) / 6.256960574), rel=1e-6)
    assert found.p == pytest.approx(4.168809e-05, rel=1e-5)
    assert [estimate.value for estimate in compare(Groups(lives=lives)).estimates] == [23.0, 8.0]


def test_holm_is_that_of_r_and_of_statsmodels():
    """R: p.adjust(c(0.01, 0.02, 0.03, 0.04, 0.05), "holm")."""
    from statsmodels.stats.multitest import multipletests

    assert holm([0.01, 0.02, 0.03, 0.04, 0.05]) == pytest.approx([0.05, 0.08, 0.09, 0.09, 0.09])
    p = np.random.default_rng(3).uniform(size=25) ** 3
    assert holm(p) == pytest.approx(multipletests(p, method="holm")[1])


def test_groups_that_do_not_differ_are_rarely_called_different_however_many_are_asked():
    rng = np.random.default_rng(5)
    called = 0
    for _ in range(100):
        groups = {name: rng.normal(size=12) for name in "abcde"}
        called += any(difference.clear for difference in compare(Groups(values={"level": groups})).differences)
    assert called / 100 < 0.05 + 3 * np.sqrt(0.05 * 0.95 / 100)


def test_a_real_difference_is_clear():
    rng = np.random.default_rng(6)
    groups = {"a": rng.normal(0, 1, 40), "b": rng.normal(2, 1, 40), "c": rng.normal(0, 1, 40)}
    clear = {(d.first, d.second): d.clear for d in compare(Groups(values={"level": groups})).differences}
    assert clear[("a", "b")]
    assert clear[("b", "c")]


@pytest.mark.parametrize("value", [0.0, -1.0, np.nan])
def test_a_ratio_of_nothing_is_refused(value):
    with pytest.raises(InputError, match="group 'a'"):
        compare(Groups(values={"level": {"a": [1.0, value], "b": [1.0, 2.0]}}, ratio_measures=("level",)))


def test_one_probe_or_none_tells_no_spread():
    found = compare(Groups(values={"level": {"a": [1.0], "b": [2.0, 3.0], "c": []}}))
    assert [estimate.low for estimate in found.estimates][::2] == [None, None]
    assert all(difference.p is None and difference.p_holm is None for difference in found.differences)
    assert found.differences[0].value == pytest.approx(-1.5)
    assert "0 comparisons" in found.said


def test_probes_needed_for_a_mean_are_those_of_statsmodels():
    from statsmodels.stats.power import TTestIndPower

    for effect in (0.3, 0.5, 0.8, 1.5):
        exact = TTestIndPower().solve_power(effect, power=0.8, alpha=0.05)
        assert power.probes_for_mean(effect) == int(np.ceil(exact))


def test_probes_needed_are_those_of_cohens_tables():
    """Cohen (1988): d = 0.5 takes 64 per group (table 2.4.1); h = 0.5 takes 63 (table 6.4.1)."""
    assert power.probes_for_mean(0.5) == 64
    second = float(np.sin(np.arcsin(np.sqrt(0.3)) + 0.25) ** 2)
    assert power.probes_for_shares(0.3, second) == 63


def test_losses_needed_are_schoenfelds():
    """A ratio of 2 takes 4 × (1.96 + 0.8416)² / (log 2)² = 65.3 losses."""
    assert power.losses_for_lives(np.log(2)) == 66


def test_more_probes_are_for_what_matters_if_the_lab_says_what_does():
    groups = {"a": [1.0, 2.0, 3.0, 2.0], "b": [1.1, 2.1, 3.1, 2.1]}
    seen = only(Groups(values={"level": groups}))
    asked = only(Groups(values={"level": groups}, matters={"level": 2.0}))
    assert seen.more_probes > 100 > asked.more_probes
    assert "2" in asked.power_for


def test_more_probes_count_in_the_groups_own_scatter():
    """A difference of 5 where probes scatter by 10 is half a deviation: 64 per group (Cohen 1988, table 2.4.1)."""
    spread = 10 * np.sqrt(3 / 4) * np.array([-1.0, -1.0, 1.0, 1.0])  # sample standard deviation 10
    found = only(Groups(values={"level": {"a": 105 + spread, "b": 100 + spread}}))
    assert found.more_probes == 64 - 4


def test_more_probes_for_lives_bring_the_losses_that_are_missing():
    """Schoenfeld: a ratio of 2 takes 66 losses; 8 probes of each kind gave 16, so 4.1 times as many are needed."""
    hours = np.arange(1.0, 9.0)
    lives = {"a": (hours, [True] * 8), "b": (hours + 0.5, [True] * 8)}
    found = only(Groups(lives=lives, matters={"survival": 2.0}))
    assert found.more_probes == int(np.ceil((66 - 16) / 16 * 8))


def test_with_the_probes_it_asks_for_the_difference_is_found_as_often_as_promised():
    rng = np.random.default_rng(9)
    count = power.probes_for_mean(0.8)
    found = [
        only(Groups(values={"x": {"a": rng.normal(0.8, 1, count), "b": rng.normal(0, 1, count)}})).clear
        for _ in range(250)
    ]
    assert np.mean(found) == pytest.approx(0.8, abs=0.06)


def test_a_ratio_of_small_numbers_is_a_ratio_like_any_other():
    large = {"a": [3.0, 4.0, 5.0], "b": [1.5, 2.5, 2.0]}
    small = {group: [value / 100 for value in values] for group, values in large.items()}
    found = [compare(Groups(values={"level": one}, ratio_measures=("level",))).differences[0] for one in (large, small)]
    assert (found[0].low, found[0].high) == pytest.approx((found[1].low, found[1].high))
