"""The most specific limit wins, and what can't hold together is said."""

import pytest

from electrolog import units
from electrolog.errors import InputError, UnknownName
from electrolog.judge.limits import RULES, LimitRow, contradictions, effective

ROWS = [
    LimitRow("least-share-left", 0.5, "common practice"),
    LimitRow("least-share-left", 0.6, "lab decision", analyte="dopamine"),
    LimitRow("least-share-left", 0.7, "lab decision", project="reward"),
    LimitRow("least-share-left", 0.8, "lab decision", analyte="dopamine", project="reward"),
]


@pytest.mark.parametrize(
    ("analyte", "project", "value", "scope"),
    [
        ("serotonin", "", 0.5, "everyone"),
        ("dopamine", "", 0.6, "dopamine"),
        ("serotonin", "reward", 0.7, "project reward"),
        ("dopamine", "reward", 0.8, "project reward, dopamine"),
        ("dopamine", "sleep", 0.6, "dopamine"),
    ],
)
@pytest.mark.parametrize("rows", [ROWS, ROWS[::-1]])
def test_the_most_specific_row_wins_in_whatever_order_they_are_kept(rows, analyte, project, value, scope):
    limit = effective(rows, analyte=analyte, project=project).get("least-share-left")
    assert (limit.value, limit.scope) == (value, scope)


def test_a_limit_for_this_run_beats_every_row_and_says_so():
    limit = effective(ROWS, analyte="dopamine", project="reward", per_run={"least-share-left": 0.9}).get(
        "least-share-left"
    )
    assert (limit.value, limit.origin, limit.scope) == (0.9, "this run", "this run")


def test_an_origin_is_carried_to_the_limit():
    assert effective(ROWS).get("least-share-left").origin == "common practice"


def test_an_unset_limit_is_unknown_even_where_common_practice_has_a_value():
    limits = effective([])
    assert limits.get("accepted-risk") is None
    assert limits.accepted_risk() is None
    assert limits.value("oldest-calibration") is None


def test_an_unknown_rule_names_the_nearest():
    with pytest.raises(UnknownName, match="least-share-left"):
        effective([], per_run={"least-share": 0.5})


@pytest.mark.parametrize(("rule", "value"), [("least-share-left", 1.2), ("accepted-risk", 0.0), ("most-uses", 0.0)])
def test_a_value_out_of_bounds_is_refused_per_run_and_reported_when_kept(rule, value):
    with pytest.raises(InputError, match=rule):
        effective([], per_run={rule: value})
    assert any(rule in said for said in contradictions(effective([LimitRow(rule, value, "lab decision")])))


def test_costs_imply_the_risk_at_which_both_choices_cost_the_same():
    rows = [
        LimitRow("cost-of-wasted-run", 19.0, "lab decision"),
        LimitRow("cost-of-discarded-probe", 1.0, "lab decision"),
    ]
    limits = effective(rows)
    risk = limits.accepted_risk()
    assert risk.value == pytest.approx(0.05)
    assert risk.value * 19.0 == pytest.approx((1 - risk.value) * 1.0)
    assert contradictions(limits) == ()


def test_a_risk_that_costs_deny_is_a_contradiction():
    rows = [
        LimitRow("cost-of-wasted-run", 19.0, "lab decision"),
        LimitRow("cost-of-discarded-probe", 1.0, "lab decision"),
        LimitRow("accepted-risk", 0.2, "lab decision"),
    ]
    assert "0.05" in contradictions(effective(rows))[0]


@pytest.mark.parametrize("alone", ["cost-of-wasted-run", "cost-of-discarded-probe"])
def test_one_cost_without_the_other_names_the_missing_one(alone):
    limits = effective([LimitRow(alone, 3.0, "lab decision")])
    assert limits.accepted_risk() is None
    (said,) = contradictions(limits)
    assert said.startswith(alone)
    assert "cost-of" in said.split("without ")[1]
    assert said.split("without ")[1][:20] != alone[:20]


def test_every_rule_says_what_it_means_and_offers_only_values_within_its_bounds():
    for name, rule in RULES.items():
        assert rule.name == name
        assert rule.meaning
        assert rule.why
        assert isinstance(rule.unit, units.Unit)
        if rule.common_practice is not None:
            assert rule.checked(rule.common_practice) == rule.common_practice


def test_common_practice_is_offered_where_there_is_one():
    """Written out a second time: a day, three times the noise, r² of 0.99, one chance in twenty (all from memory)."""
    usual = {name: rule.common_practice for name, rule in RULES.items() if rule.common_practice is not None}
    assert usual == {
        "signal-to-noise": 3.0,
        "oldest-calibration": 24.0,
        "lowest-r-squared": 0.99,
        "accepted-risk": 0.05,
    }
