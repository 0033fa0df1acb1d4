"""Known causes leave their marks, and the diagnosis finds them, or says that it can't tell."""

from dataclasses import replace

import numpy as np
import pytest

from electrolog.judge.diagnosis import LIKELY, UNLIKELY, UNTOLD, Symptoms, diagnose

SD = 0.04
# Everything measured and nothing wrong, after a run that was expected to take 20 %.
HEALTHY = Symptoms(
    log_change=0.0,
    log_change_sd=SD,
    exposure_h=4.0,
    expected_log_change=-0.22,
    expected_sd=0.06,
    others_log_surprise=0.0,
    others_sd=0.02,
    others_count=6,
    oxidation_shift_v=0.0,
    reduction_shift_v=0.0,
    log_background=0.0,
    log_exposed_length=0.0,
    log_noise=0.0,
    seal_ok=True,
    coated=True,
    log_selectivity=0.0,
)

# What each cause does to a probe that, but for it, did what its exposure made expect (no exposure: nothing).
RESTED = replace(HEALTHY, exposure_h=0.0, expected_log_change=0.0, expected_sd=0.03)
MADE = {
    "fouling": replace(HEALTHY, log_change=-0.22),
    "a drifting reference electrode": replace(RESTED, oxidation_shift_v=0.12, reduction_shift_v=0.11),
    "slower electron transfer": replace(RESTED, log_change=-0.1, oxidation_shift_v=0.08, reduction_shift_v=-0.06),
    "loss of area": replace(RESTED, log_change=-0.5, log_background=-0.48, log_exposed_length=-0.45),
    "a failing seal": replace(RESTED, log_noise=1.1, log_background=0.3, seal_ok=False),
    "loss of coating": replace(RESTED, log_selectivity=-0.8),
    "a bad standard": replace(RESTED, log_change=-0.3, others_log_surprise=-0.31),
    "a slip of entry": replace(RESTED, log_change=np.log(1000) + 0.02),
}


BOTH_PEAKS = "a drifting reference electrode"


def finding(diagnosis, cause):
    (found,) = [finding for finding in diagnosis.findings if finding.cause == cause]
    return found


@pytest.mark.parametrize("cause", MADE)
def test_each_cause_is_found_by_its_marks_and_named_first(cause):
    found = diagnose(MADE[cause])
    assert found.findings[0].cause == cause
    assert found.findings[0].judgement == LIKELY
    assert found.findings[0].evidence_for
    assert found.findings[0].next_step
    assert cause in found.said


def measured(made, rng):
    """The same symptoms as an ordinary bench would measure them."""
    return replace(
        made,
        log_change=made.log_change + SD * rng.standard_normal(),
        others_log_surprise=made.others_log_surprise + 0.02 * rng.standard_normal(),
        oxidation_shift_v=made.oxidation_shift_v + 0.008 * rng.standard_normal(),
        reduction_shift_v=made.reduction_shift_v + 0.008 * rng.standard_normal(),
        log_background=made.log_background + 0.08 * rng.standard_normal(),
        log_exposed_length=made.log_exposed_length + 0.05 * rng.standard_normal(),
        log_noise=made.log_noise + 0.2 * rng.standard_normal(),
        log_selectivity=made.log_selectivity + 0.1 * rng.standard_normal(),
    )


@pytest.mark.parametrize("cause", MADE)
def test_it_is_found_under_the_errors_of_measurement_too(cause):
    rng = np.random.default_rng(sorted(MADE).index(cause))
    hits = sum(diagnose(measured(MADE[cause], rng)).findings[0].cause == cause for _ in range(200))
    assert hits >= 180


def test_a_probe_with_nothing_wrong_is_seldom_accused():
    rng = np.random.default_rng(12)
    accused = sum(diagnose(measured(RESTED, rng)).findings[0].judgement == LIKELY for _ in range(400))
    assert accused <= 20


def test_a_rested_probe_that_reads_the_same_has_no_likely_cause():
    found = diagnose(RESTED)
    assert all(finding.judgement != LIKELY for finding in found.findings)
    assert "within what two calibrations" in found.said


def test_a_loss_with_nothing_else_measured_is_not_enough_to_tell():
    found = diagnose(Symptoms(log_change=-0.4, log_change_sd=SD))
    assert "not enough to tell why" in found.said
    for cause in ("a drifting reference electrode", "loss of coating", "a bad standard", "loss of area", "fouling"):
        assert finding(found, cause).judgement == UNTOLD


def test_evidence_that_hardly_weighs_is_not_enough_to_tell():
    """Both peaks moved by what a reference may wander without being at fault."""
    found = finding(diagnose(replace(RESTED, oxidation_shift_v=0.032, reduction_shift_v=0.032)), BOTH_PEAKS)
    assert abs(found.weight) < 0.7
    assert found.judgement == UNTOLD
    assert found.evidence_for or found.evidence_against


def test_evidence_against_is_named_with_its_numbers():
    found = finding(diagnose(MADE["loss of area"]), "fouling")
    assert found.judgement == UNLIKELY
    assert any("no exposure" in text for text in found.evidence_against)
    assert any("background current -38 %" in text for text in found.evidence_against)


def test_an_uncoated_probe_lost_no_coating():
    symptoms = replace(MADE["loss of coating"], coated=False)
    assert finding(diagnose(symptoms), "loss of coating").judgement == UNLIKELY


def test_a_bad_standard_needs_the_other_probes_to_agree_in_size():
    elsewhere = replace(MADE["a bad standard"], others_log_surprise=0.0)
    assert finding(diagnose(elsewhere), "a bad standard").judgement == UNLIKELY


def test_no_clue_weighs_beyond_its_cap():
    extreme = replace(HEALTHY, oxidation_shift_v=5.0, reduction_shift_v=5.0)
    assert finding(diagnose(extreme), "a drifting reference electrode").weight == 2.5


def test_two_causes_can_hold_at_once():
    both = replace(MADE["fouling"], log_selectivity=-0.8)
    likely = {finding.cause for finding in diagnose(both).findings if finding.judgement == LIKELY}
    assert likely == {"fouling", "loss of coating"}


@pytest.mark.parametrize("decades", [-6, -3, -1, 1, 3, 6])
def test_a_slip_is_found_whichever_way_the_point_went(decades):
    found = diagnose(replace(RESTED, log_change=decades * np.log(10) + 0.02))
    assert finding(found, "a slip of entry").judgement == LIKELY
