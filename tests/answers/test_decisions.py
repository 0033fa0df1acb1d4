"""Decisions asked of a record, on labs of known truth: fit holds, and hardly fewer are fit than could be."""

from __future__ import annotations

from pathlib import Path

import pytest
from scipy.stats import binom

from tests.answers.decisions import RISK, Decisions, decided, joined


@pytest.fixture(scope="module")
def decisions(tmp_path_factory: pytest.TempPathFactory) -> Decisions:
    """A lab whose probes lose evenly, and one that sometimes types a decimal wrong."""
    families = ("exponential", "slips")
    return joined([decided(family, 0, 120, Path(tmp_path_factory.mktemp(family))) for family in families])


def test_among_fit_the_share_that_breaks_is_within_the_accepted_risk(decisions: Decisions) -> None:
    assert decisions.fit.sum() > 60
    assert decisions.fit_that_break <= RISK + 0.02


def test_nearly_as_many_of_the_good_are_called_fit_as_the_oracle_calls(decisions: Decisions) -> None:
    assert decisions.good_called_fit >= 0.95


def test_the_retired_were_broken(decisions: Decisions) -> None:
    assert decisions.retired.sum() > 30
    assert decisions.broken_now[decisions.retired].mean() > 0.9


def test_a_promised_run_holds_as_often_as_promised_and_is_no_fraction_of_the_true_one(decisions: Decisions) -> None:
    """A hundred runs can't tell 5 % from 7 %: they may break as often as 5 % does in 99 of 100 labs."""
    broken, promised = decisions.promised_that_break
    assert promised > 100
    assert broken <= binom.ppf(0.99, promised, RISK)
    assert decisions.longest_of_true > 0.6
