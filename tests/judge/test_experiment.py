"""The next measurement goes where it teaches most."""

import itertools

import numpy as np
import pytest

from electrolog.errors import InputError
from electrolog.judge.experiment import make_next, recalibrate_first
from electrolog.judge.verdict import judge
from tests.judge.known_probes import Known, fresh, question

RNG = np.random.default_rng(14)


def test_the_probe_in_doubt_is_recalibrated_first_and_the_sure_ones_not_at_all():
    probes = {
        "sure": Known(rate=0.001),
        "dead": Known(log_share=-2.0),
        "doubtful": Known(log_share=-0.25, sd=0.1, rate=0.01),
        "fair": Known(log_share=-0.2, sd=0.05, rate=0.01),
    }
    values = {label: judge(question(probe)).value_of_calibration for label, probe in probes.items()}
    assert next(one.probe for one in recalibrate_first(values)) == "doubtful"
    assert not {"sure", "dead"} & {one.probe for one in recalibrate_first(values)}


def test_a_sound_probe_whose_calibration_no_longer_stands_is_worth_one():
    stale = judge(question(Known(rate=0.001), calibration=fresh(age_h=100.0))).value_of_calibration
    (first,) = recalibrate_first({"stale": stale})
    assert first.saved_runs == pytest.approx(0.05 / 0.95)  # the probe that setting it aside would lose


def test_more_probes_go_to_the_group_that_scatters_and_has_few():
    found = make_next({"few": RNG.normal(0, 1, 4), "many": RNG.normal(0, 1, 40)}, 10)
    assert found.more == {"few": 10, "many": 0}
    assert found.widest_then < found.widest_now


def test_the_widest_difference_is_then_as_narrow_as_any_split_makes_it():
    groups = {"a": RNG.normal(0, 2, 5), "b": RNG.normal(0, 1, 3), "c": RNG.normal(0, 1, 9)}
    found = make_next(groups, 6)
    assert sum(found.more.values()) == 6

    def widest(split):
        errors = sorted(
            values.var(ddof=1) / (len(values) + n) for values, n in zip(groups.values(), split, strict=True)
        )
        return np.sqrt(errors[-1] + errors[-2])

    splits = [split for split in itertools.product(range(7), repeat=3) if sum(split) == 6]
    assert found.widest_then == pytest.approx(min(widest(split) for split in splits))


def test_a_new_kind_tried_once_is_taken_to_scatter_as_the_others():
    known = RNG.normal(5, 1, 20)
    found = make_next({"tried": [1.0], "known": known}, 3)
    assert found.more == {"tried": 3, "known": 0}
    assert found.widest_now == pytest.approx(known.std(ddof=1) * np.sqrt(1 + 1 / 20))
    assert found.widest_then == pytest.approx(known.std(ddof=1) * np.sqrt(1 / 4 + 1 / 20))


@pytest.mark.parametrize(
    ("groups", "count"), [({"a": [1.0, 2.0]}, 3), ({"a": [1.0], "b": [2.0]}, 3), ({"a": [1.0, 2.0], "b": []}, 1)]
)
def test_what_can_not_be_planned_is_refused(groups, count):
    with pytest.raises(InputError):
        make_next(groups, count)
