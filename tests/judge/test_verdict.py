"""Fit, recalibrate, retire or undetermined, and the reasons said with numbers."""

import json
import math
from dataclasses import replace

import numpy as np
import pytest

from electrolog.errors import InputError
from electrolog.judge.facts import CalibrationFacts
from electrolog.judge.verdict import judge
from electrolog.judge.words import chance
from tests.judge.known_probes import DRAWS, Known, fresh, limits, question


def rules(verdict):
    return [reason.rule for reason in verdict.reasons]


def texts(verdict):
    return " ".join(reason.text for reason in verdict.reasons)


def test_a_sound_probe_and_a_short_run_are_fit():
    verdict = judge(question(Known(rate=0.02)))
    assert verdict.verdict == "fit"
    assert verdict.p_breach < 0.001
    assert "96 % of the reference sensitivity left" in texts(verdict)
    assert verdict.changes == ()


def test_the_odds_are_those_of_the_closed_form():
    probe = Known(log_share=-0.2, sd=0.06, rate=0.03, rate_sd=0.005)
    verdict = judge(question(probe, run_min=180))
    assert verdict.p_breach == pytest.approx(probe.p_below(0.7, 180), abs=0.005)
    assert verdict.p_breach_now == pytest.approx(probe.p_below(0.7, 0), abs=0.002)


@pytest.mark.parametrize("probe", [Known(rate=0.1), Known(rate=0.05, rate_sd=0.01), Known(log_share=-0.1, sd=0.05)])
def test_the_longest_run_is_where_the_odds_reach_the_accepted_risk(probe):
    longest = judge(question(probe)).longest_run_min
    assert probe.p_below(0.7, longest) <= 0.053
    assert probe.p_below(0.7, longest + 4) > 0.047
    assert judge(question(probe, run_min=longest)).verdict == "fit"
    assert judge(question(probe, run_min=longest + 2)).verdict != "fit"


def test_a_probe_that_never_fouls_has_its_longest_run_capped():
    assert judge(question(Known(rate=0.0))).longest_run_min == 72 * 60


@pytest.mark.parametrize("name", ["least_share_left", "accepted_risk", "oldest_calibration"])
def test_an_unset_limit_is_never_fit(name):
    verdict = judge(question(Known(rate=0.0), limits=limits(**{name: None})))
    assert verdict.verdict == "undetermined"
    assert name.replace("_", "-") in rules(verdict)


def test_the_smallest_signal_to_be_seen_stands_in_for_a_share():
    asked = question(Known(rate=0.0), limits=limits(least_share_left=None), needs_um=0.05)
    verdict = judge(asked)
    assert verdict.verdict == "fit"  # 3 × 0.05 nA / 10 nA/µM = 15 nM
    assert verdict.lod_um.end[1] == pytest.approx(0.015, rel=0.01)
    assert judge(replace(asked, needs_um=0.012)).verdict == "retire"


def test_costs_stand_in_for_the_accepted_risk():
    priced = limits(accepted_risk=None, cost_of_wasted_run=19.0, cost_of_discarded_probe=1.0)
    assert judge(question(Known(rate=0.02), limits=priced)).verdict == "fit"


def test_contradicting_limits_are_undetermined():
    verdict = judge(question(limits=limits(cost_of_wasted_run=3.0)))
    assert (verdict.verdict, rules(verdict)) == ("undetermined", ["limits"])


def test_a_probe_never_calibrated_so_is_to_be_calibrated():
    verdict = judge(question(calibration=None, reference_log_sensitivity=None, assay="serotonin with serotonin-n"))
    assert verdict.verdict == "recalibrate"
    assert "never calibrated with serotonin with serotonin-n" in texts(verdict)
    assert verdict.p_breach is None


@pytest.mark.parametrize(
    ("changed", "said"),
    [
        ({"age_h": 30.0}, "30 h old; the limit is 24 h"),
        ({"events_since": ("a run on 3 May", "cleaned")}, "a run on 3 May, cleaned"),
        ({"standard_past_use_by": True}, "use-by"),
    ],
)
def test_a_stale_or_voided_calibration_is_never_fit(changed, said):
    verdict = judge(question(Known(rate=0.0), calibration=fresh(**changed)))
    assert verdict.verdict == "recalibrate"
    assert said in texts(verdict)
    assert verdict.p_breach < 0.01  # age breaks nothing about the probe


def test_a_calibration_in_the_future_is_a_matter_of_clocks():
    assert judge(question(calibration=fresh(age_h=-3.0))).verdict == "undetermined"


def test_a_probe_surely_broken_now_is_retired_stale_or_not():
    dead = Known(log_share=math.log(0.4))
    assert judge(question(dead)).verdict == "retire"
    assert judge(question(dead, calibration=fresh(age_h=100.0))).verdict == "retire"
    assert judge(question(dead)).longest_run_min == 0
    assert judge(question(dead)).changes == ()


def test_where_a_calibration_could_settle_it_recalibrate_says_its_chance():
    verdict = judge(question(Known(log_share=-0.15, sd=0.15, rate=0.01)))
    assert verdict.verdict == "recalibrate"
    assert verdict.value_of_calibration.chance_fit > 0.5
    assert rules(verdict) == ["least-share-left"]
    assert any(change.what == "recalibrate" and "chance" in change.text for change in verdict.changes)


def test_a_sound_probe_and_a_run_too_long_says_the_longest_run():
    """It must not be thrown away, and a calibration of what is already known so well would not save the run."""
    verdict = judge(question(Known(sd=0.01, rate=0.1), run_min=8 * 60))
    assert verdict.verdict == "recalibrate"
    assert rules(verdict)[0] == "run-length"
    assert "shorten it to 3 h" in texts(verdict)
    assert [change.what for change in verdict.changes] == ["shorten"]


def test_most_likely_broken_and_beyond_what_a_calibration_tells_is_retired():
    verdict = judge(question(Known(log_share=math.log(0.7) - 0.005, sd=0.01, rate=0.02), reading_sd_log=0.05))
    assert 0.5 < verdict.p_breach_now < 0.95
    assert verdict.verdict == "retire"


@pytest.mark.parametrize(
    ("probe", "reading_sd_log"),
    [
        (
            Known(log_share=math.log(0.7) - 0.01, sd=0.1, rate=0.2),
            0.03,
        ),  # likelier broken than not, but it could read well
        (Known(log_share=math.log(0.7) + 0.01, sd=0.02, rate=0.05), 0.5),  # hardly to be cleared, but likelier sound
    ],
)
def test_what_may_be_sound_is_not_thrown_away_for_a_run_too_long(probe, reading_sd_log):
    verdict = judge(question(probe, reading_sd_log=reading_sd_log))
    assert verdict.value_of_calibration.chance_fit < 0.1
    assert verdict.p_breach_now > 0.05
    assert (verdict.verdict, rules(verdict)[0]) == ("recalibrate", "run-length")


def test_cleaning_first_is_offered_by_the_labs_own_recovery():
    worn, cleaned = Known(log_share=-0.3, sd=0.05, rate=0.05), Known(log_share=-0.05, sd=0.05, rate=0.05)
    verdict = judge(question(worn, after_cleaning={"ethanol dip": cleaned.log_sensitivity_at}))
    (clean,) = [change for change in verdict.changes if change.what == "clean"]
    assert clean.p_breach < 0.05 < verdict.p_breach
    assert "ethanol dip" in clean.text


def test_cleaning_that_hardly_helps_is_not_offered_and_the_best_comes_first():
    worn = Known(log_share=-0.3, sd=0.05, rate=0.05)
    gained = {"rinse": -0.295, "dip": -0.2, "cycling": -0.1}
    cleaned = {method: replace(worn, log_share=share).log_sensitivity_at for method, share in gained.items()}
    offered = [
        change.text for change in judge(question(worn, after_cleaning=cleaned)).changes if change.what == "clean"
    ]
    assert [text.split(")")[0] for text in offered] == ["clean first (cycling", "clean first (dip"]


def test_a_dead_probe_s_sentences_stay_readable():
    said = texts(judge(question(Known(log_share=-20.0), limits=limits(highest_detection_limit=0.1))))
    assert "<1 % of the reference sensitivity" in said
    assert "detection limit at the end over 1 M" in said


def test_odds_of_two_limits_are_of_either_not_their_sum():
    probe = Known(log_share=math.log(0.7), sd=0.05, rate=0.0)
    lod_um = 3 * 0.05 / 7.0  # the detection limit reaches this in the very draws that break the share
    verdict = judge(question(probe, limits=limits(highest_detection_limit=lod_um)))
    assert list(verdict.p_by_rule.values()) == pytest.approx([0.5, 0.5], abs=0.01)
    assert verdict.p_breach == pytest.approx(0.5, abs=0.01)


def test_without_noise_a_detection_limit_is_undetermined():
    silent = fresh(noise_na=None)
    verdict = judge(question(Known(rate=0.0), calibration=silent, needs_um=0.05))
    assert verdict.verdict == "undetermined"
    assert verdict.p_breach is None
    assert "needs" in rules(verdict)
    assert verdict.lod_um.to_dict() == {
        "now": {"0.05": None, "0.5": None, "0.95": None},
        "end": {"0.05": None, "0.5": None, "0.95": None},
    }


def test_odds_of_some_limits_alone_are_not_the_odds_unless_they_decide():
    silent = fresh(noise_na=None)
    worn = judge(question(Known(log_share=-0.33, sd=0.05), calibration=silent, needs_um=0.05))
    assert (worn.verdict, worn.p_breach) == ("undetermined", None)
    assert worn.p_by_rule["least-share-left"] > 0.3
    dead = judge(question(Known(log_share=-1.0), calibration=silent, needs_um=0.05))
    assert (dead.verdict, dead.p_breach) == ("retire", 1.0)


def test_noise_from_few_points_widens_the_detection_limit():
    """s·√(ν/χ²) at ν = 2: the 95 % quantile is s·√(2/0.1026) = 4.42 s (χ² tables, 0.05 quantile 0.1026)."""
    few = fresh(noise_na=None, residual_sd_na=0.05, residual_degrees_of_freedom=2)
    verdict = judge(question(Known(sd=1e-6, rate=0.0), calibration=few, needs_um=0.05))
    assert verdict.lod_um.now[2] == pytest.approx(3 * 0.05 * math.sqrt(2 / 0.1026) / 10, rel=0.02)
    assert "about the line" in texts(verdict)


def test_the_detection_limit_rests_on_what_is_known_best():
    measured = {"blank_sd_na": 0.04, "residual_sd_na": 0.05}
    few_blanks = fresh(noise_na=None, blank_degrees_of_freedom=1, residual_degrees_of_freedom=6, **measured)
    many_blanks = fresh(noise_na=None, blank_degrees_of_freedom=6, residual_degrees_of_freedom=6, **measured)
    noted = fresh(noise_na=0.03, blank_degrees_of_freedom=6, residual_degrees_of_freedom=6, **measured)
    for facts, said in ((few_blanks, "about the line"), (many_blanks, "blanks"), (noted, "the signal's noise")):
        assert said in texts(judge(question(calibration=facts, needs_um=0.05)))


def test_a_set_limit_that_nobody_measured_is_undetermined():
    verdict = judge(question(Known(rate=0.0), limits=limits(largest_peak_shift=0.05)))
    assert (verdict.verdict, rules(verdict)[0]) == ("undetermined", "largest-peak-shift")


@pytest.mark.parametrize(
    ("limit", "measured", "word"),
    [
        ({"lowest_r_squared": 0.99}, {"r_squared": 0.95}, "recalibrate"),
        ({"largest_peak_shift": 0.05}, {"peak_shift_v": -0.08}, "recalibrate"),
        ({"highest_noise": 0.04}, {"noise_na": 0.05}, "recalibrate"),
        ({"highest_noise": 0.04}, {"noise_na": 0.05, "noise_before_na": 0.06}, "retire"),
        ({"highest_noise": 0.06}, {"noise_na": 0.05, "noise_before_na": 0.08}, "fit"),
        ({"highest_noise": 0.05}, {"noise_na": 0.05}, "fit"),
        ({"lowest_r_squared": 0.99}, {"r_squared": 0.99}, "fit"),
        ({"largest_peak_shift": 0.05}, {"peak_shift_v": -0.05}, "fit"),
    ],
)
def test_what_the_last_calibration_itself_broke(limit, measured, word):
    verdict = judge(question(Known(rate=0.0), limits=limits(**limit), calibration=fresh(**measured)))
    assert verdict.verdict == word
    assert verdict.p_breach == (pytest.approx(0.0) if word == "fit" else 1.0)


def test_too_many_uses_retire_whatever_else_holds():
    asked = question(Known(rate=0.0), limits=limits(most_uses=3.0))
    assert judge(replace(asked, uses=2)).verdict == "fit"
    assert judge(replace(asked, uses=3)).verdict == "retire"


def test_an_interval_too_wide_is_not_fit_and_a_good_calibration_could_narrow_it():
    verdict = judge(question(Known(sd=0.1, rate=0.0), limits=limits(widest_interval=0.2)))
    assert verdict.verdict == "recalibrate"
    assert "33 % wide; the limit is 20 %" in texts(verdict)
    assert verdict.longest_run_min == 0


def test_a_probe_out_of_use_is_retired_with_its_reason():
    verdict = judge(question(out_of_use="retired on 3 May: broken tip"))
    assert (verdict.verdict, texts(verdict)) == ("retire", "retired on 3 May: broken tip")


@pytest.mark.parametrize("run_min", [0.0, -5.0, math.nan, math.inf])
def test_a_run_that_is_no_run_is_refused(run_min):
    with pytest.raises(InputError, match="longer than zero"):
        judge(question(run_min=run_min))


@pytest.mark.parametrize("needs_um", [0.0, -1.0, math.nan])
def test_a_needed_concentration_of_nothing_is_refused(needs_um):
    with pytest.raises(InputError, match="above zero"):
        judge(question(needs_um=needs_um))


def test_the_machine_readable_answer_has_the_contracts_keys_and_no_nan():
    found = judge(question()).to_dict()
    assert set(found) == {
        "verdict",
        "reasons",
        "p_breach",
        "longest_run_min",
        "sensitivity_na_um",
        "fraction_left",
        "lod_um",
    }
    assert set(found["lod_um"]["now"]) == {"0.05", "0.5", "0.95"}
    json.dumps(found, allow_nan=False)


def test_quantiles_are_those_of_the_truth():
    verdict = judge(question(Known(sd=0.1, rate=0.0)))
    low, middle, high = verdict.sensitivity_na_um.now
    assert (low, middle, high) == pytest.approx((10 * np.exp(-0.1645), 10, 10 * np.exp(0.1645)), rel=2e-3)


def test_a_calibration_without_any_figures_still_gives_an_answer():
    bare = CalibrationFacts(age_h=1.0)
    assert judge(question(Known(rate=0.0), calibration=bare)).verdict == "fit"
    assert len(question().log_sensitivity_at(0.0)) == DRAWS


@pytest.mark.parametrize(
    ("p", "said"), [(0.0, "<1 %"), (0.0099, "<1 %"), (0.01, "1 %"), (0.99, "99 %"), (0.991, ">99 %"), (1.0, ">99 %")]
)
def test_odds_from_draws_are_never_said_to_be_none_or_certain(p, said):
    assert chance(p) == said
