from dataclasses import replace
from datetime import UTC, datetime, timedelta

import numpy as np
import pytest

from electrolog.measure.health import Circumstances, day_points_at_the_standard, shared_shift, unhealthy
from electrolog.measure.use_by import RULES, past_use_by, use_by

NOON = datetime(2031, 3, 4, 12, tzinfo=UTC)
BEFORE = Circumstances(
    at=NOON - timedelta(days=2),
    analyte="dopamine",
    medium="aCSF",
    temperature_c=22.0,
    noise_na=0.05,
    background_na=400.0,
    oxidation_peak_v=0.65,
    reduction_peak_v=-0.20,
    lowest_um=0.25,
    highest_um=2.0,
)
NOW = replace(BEFORE, at=NOON, standard_prepared_at=NOON - timedelta(hours=1), diluent="PBS")


def test_a_calibration_like_the_last_has_no_warning():
    assert unhealthy(NOW, [BEFORE], expected_um=(0.3, 1.5)) == ()


def test_what_is_unknown_is_not_judged():
    assert unhealthy(Circumstances(at=NOON), [BEFORE]) == ()
    assert unhealthy(NOW, [Circumstances(at=NOON)]) == ()
    assert unhealthy(NOW) == ()


def only(*, expected_um=None, **changed):
    (said,) = unhealthy(replace(NOW, **changed), [BEFORE], expected_um=expected_um)
    return said


def test_a_standard_past_its_use_by():
    assert "5 h old; dopamine in PBS keeps 4 h" in only(standard_prepared_at=NOON - timedelta(hours=5))
    assert "2 h after it expired" in only(standard_expires_at=NOON - timedelta(hours=2))


def test_a_standard_of_another_analyte():
    assert "holds serotonin, and dopamine was measured" in only(standard_analyte="serotonin")
    assert unhealthy(replace(NOW, standard_analyte="dopamine"), [BEFORE]) == ()


def test_what_the_bottle_says_goes_before_the_rule():
    fresh = NOON + timedelta(hours=1)
    assert past_use_by("dopamine", "PBS", NOON - timedelta(days=3), fresh, NOON) is None


def test_acid_keeps_longer_and_an_unknown_diluent_is_no_acid():
    assert use_by("dopamine", "0.1 M perchloric acid", NOON) == NOON + timedelta(days=7)
    assert use_by("Dopamine", None, NOON) == use_by("dopamine", "aCSF", NOON) == NOON + timedelta(hours=4)
    assert use_by("an analyte of the lab's own", "PBS", NOON) is None
    assert all(rule.acid_h > rule.buffer_h for rule in RULES.values())


def test_temperature_and_medium_unlike_the_others():
    assert "37 °C, the one before at 22 °C" in only(temperature_c=37.0)
    assert "measured in PBS, earlier ones in aCSF" in only(medium="PBS")


def test_both_peaks_alike_is_the_reference_electrode():
    said = only(oxidation_peak_v=0.75, reduction_peak_v=-0.10)
    assert "alike by +0.1 V" in said
    assert "reference electrode" in said


def test_a_wider_separation_is_the_probe():
    said = only(oxidation_peak_v=0.75, reduction_peak_v=-0.28)
    assert "0.18 V farther apart" in said
    assert "fouling" in said
    assert "closer" in only(oxidation_peak_v=0.55, reduction_peak_v=-0.15)


def test_one_peak_alone_tells_no_cause():
    said = only(oxidation_peak_v=0.75, reduction_peak_v=None)
    assert "oxidation peak shifted by +0.1 V" in said
    assert "can't be told apart" in said


def test_the_lab_sets_what_counts_as_a_shift():
    moved = replace(NOW, oxidation_peak_v=0.68, reduction_peak_v=-0.17)
    assert unhealthy(moved, [BEFORE]) == ()
    assert len(unhealthy(moved, [BEFORE], peak_shift_v=0.02)) == 1


def test_background_and_noise():
    assert "+50%" in only(background_na=600.0)
    assert "-50%" in only(background_na=200.0)
    assert "2 times" in only(noise_na=0.1)


def test_a_range_that_misses_the_signal():
    assert "0.25 to 2 µM, but a signal of 0.05 to 1 µM" in only(expected_um=(0.05, 1.0))


def test_the_last_known_value_counts():
    unknown = replace(BEFORE, at=NOON - timedelta(days=1), background_na=None)
    assert unhealthy(replace(NOW, background_na=600.0), [BEFORE, unknown]) != ()


def test_a_shift_of_all_probes_points_at_the_standard():
    said = day_points_at_the_standard(np.log([0.80, 0.82, 0.79, 0.81]), "standard S-12")
    assert said.startswith("all 4 probes measured with standard S-12 read -19.5% ")
    assert "not at the probes" in said


def test_probes_that_shift_each_their_own_way_accuse_nothing():
    assert day_points_at_the_standard(np.log([0.8, 1.1, 0.9, 1.2]), "standard S-12") is None
    assert day_points_at_the_standard(np.log([0.5, 0.97, 0.9, 0.7]), "standard S-12") is None
    assert day_points_at_the_standard(np.log([0.8, 0.8]), "standard S-12") is None


def test_honest_days_are_accused_rarely():
    random = np.random.default_rng(1)
    accused = sum(shared_shift(random.normal(0, 0.05, 5)) is not None for _ in range(3000))
    assert accused / 3000 == pytest.approx(0.01, abs=0.006)


@pytest.mark.parametrize(("noise_na", "noisier"), [(0.073, False), (0.077, True)])
def test_noise_half_as_high_again_is_too_high(noise_na, noisier):
    """0.05 nA before: common practice."""
    assert bool(unhealthy(replace(NOW, noise_na=noise_na), [BEFORE])) is noisier
