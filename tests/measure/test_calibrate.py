"""The door: what a calibration says, what it can't say, and that it says so."""

import json
import subprocess
import sys

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from electrolog.errors import InputError
from electrolog.measure.calibrate import CalibrationFigures, calibrate, factor_only
from electrolog.measure.line import fit_line
from electrolog.measure.linear import linear_to_um

X = np.array([0, 0.25, 0.5, 1, 2])
SCATTER = np.array([0.3, -0.2, 0.4, -0.5, 0.1])
Y = 20 * X + SCATTER


def said(figures, *words):
    return any(all(word in text for word in words) for text in figures.warnings)


def test_a_sound_calibration_has_every_figure_and_no_warning():
    figures = calibrate(X, Y, noise_na=0.05, standard_relative_uncertainty=0.02)
    line = fit_line(X, Y)
    assert figures.warnings == ()
    assert figures.shape == "line"
    assert figures.sensitivity_na_um == line.slope_na_um
    assert figures.sensitivity_se_na_um == line.slope_se_na_um
    assert (figures.n_points, figures.degrees_of_freedom, figures.linear_to_um) == (5, 3, 2.0)
    assert figures.lod_um == pytest.approx(3 * 0.05 / line.slope_na_um)
    assert figures.loq_um == pytest.approx(10 * 0.05 / line.slope_na_um)
    assert "noise" in figures.lod_route


def test_without_noise_the_detection_limit_rests_on_the_scatter():
    figures = calibrate(X, Y)
    assert figures.lod_um == pytest.approx(3 * figures.residual_sd_na / figures.sensitivity_na_um)
    assert "residual" in figures.lod_route


def test_the_standard_is_seen_apart_and_counts_in_the_interval():
    plain, shared = calibrate(X, Y), calibrate(X, Y, standard_relative_uncertainty=0.1)
    assert shared.sensitivity_se_na_um == plain.sensitivity_se_na_um
    assert shared.sensitivity_se_shared_na_um == pytest.approx(0.1 * plain.sensitivity_na_um)
    assert plain.sensitivity_se_shared_na_um is None
    half = plain.sensitivity_high_na_um - plain.sensitivity_na_um
    assert half == pytest.approx(3.182446305 * plain.sensitivity_se_na_um)  # Student's t, 3 degrees of freedom
    wider = shared.sensitivity_high_na_um - shared.sensitivity_na_um
    assert wider == pytest.approx(np.hypot(half, 1.96 * shared.sensitivity_se_shared_na_um))


def test_figures_are_json_without_nan_and_come_back():
    for points in ((X, Y), ([0, 1], [0, 12]), ([1], [12]), ([], []), ([0, 0], [1, 2]), ([0, 1, 2], [0, 0, 0])):
        figures = calibrate(*points)
        text = json.dumps(figures.to_dict(), allow_nan=False)
        assert CalibrationFigures.from_dict(json.loads(text)) == figures


def test_two_points_have_a_sensitivity_and_no_error():
    figures = calibrate([0, 1], [0.5, 12.5])
    assert (figures.sensitivity_na_um, figures.intercept_na, figures.shape) == (12, 0.5, "line")
    assert figures.sensitivity_se_na_um is figures.lod_um is figures.linear_to_um is figures.r_squared is None
    assert said(figures, "2 points", "no standard error")
    assert calibrate([0, 1], [0.5, 12.5], noise_na=0.1).lod_um == pytest.approx(0.025)


def test_one_point_assumes_a_line_through_zero():
    figures = calibrate([2], [24])
    assert (figures.sensitivity_na_um, figures.shape) == (12, "line-through-zero")
    assert figures.sensitivity_se_na_um is None
    assert said(figures, "one concentration only (2 µM)", "no standard error")


def test_one_concentration_has_the_error_of_its_replicates():
    figures = calibrate([2, 2, 2], [24, 25, 23])
    assert figures.sensitivity_na_um == 12
    assert figures.sensitivity_se_na_um == pytest.approx(1 / np.sqrt(3) / 2)
    assert figures.shape == "line-through-zero"
    assert said(figures, "through zero", "can't test")


def test_without_a_concentration_above_zero_nothing_is_known():
    figures = calibrate([0, 0], [1, 2])
    assert (figures.sensitivity_na_um, figures.shape, figures.n_points) == (None, None, 2)
    assert said(figures, "every concentration is zero")
    assert said(calibrate([], []), "no points")


def test_no_current_is_no_response():
    figures = calibrate([0, 1, 2, 3], [0, 0, 0, 0])
    assert figures.sensitivity_na_um == 0
    assert figures.lod_um is figures.r_squared is None
    assert said(figures, "no response")


def test_oxidation_recorded_negative_is_asked_and_never_turned():
    figures = calibrate(X, -Y - 1)
    assert figures.sensitivity_na_um == pytest.approx(-calibrate(X, Y).sensitivity_na_um)
    assert figures.lod_um is figures.loq_um is figures.linear_to_um is None
    assert said(figures, "oxidation recorded as negative")


def test_a_sensitivity_like_zero_gives_no_limit():
    figures = calibrate([0, 1, 2, 3], [1, 3, -2, 3], noise_na=0.1)
    assert figures.sensitivity_na_um > 0
    assert figures.lod_um is figures.linear_to_um is None
    assert said(figures, "can't be told from zero")


def test_a_bend_makes_the_shape_saturating():
    x = np.array([0, 0.25, 0.5, 1, 2, 4])
    figures = calibrate(x, 20 * x / (1 + 0.3 * x) + SCATTER[[0, 1, 2, 3, 4, 0]] / 10)
    assert figures.shape == "saturating"
    assert figures.sensitivity_na_um == pytest.approx(20, abs=2 * 3.182 * figures.sensitivity_se_na_um)
    assert figures.linear_to_um == pytest.approx(0.05 / 0.95 / 0.3, rel=0.1)
    assert said(figures, "levels off")
    assert not said(figures, "misses zero")  # the straight line through a bend does; the bend doesn't


def test_replicates_let_a_lesser_bend_be_seen():
    x = np.repeat([0, 0.5, 1, 2, 4], 3)
    y = 20 * x / (1 + 0.05 * x) + np.tile([0.5, -0.5, 0.1], 5)
    assert calibrate(x, y).shape == "saturating"


def test_straight_lines_stay_lines():
    """A needless curve costs precision: of 500 straight calibrations hardly more than 1 % are called bent."""
    random = np.random.default_rng(9)
    bent = sum(calibrate(X, 20 * X + random.normal(0, 0.5, 5)).shape == "saturating" for _ in range(500))
    assert bent <= 12


def test_a_bend_upwards_is_said_and_stays_a_line():
    figures = calibrate([0, 0.25, 0.5, 1, 2, 4], [0.1, 2.6, 5.9, 13.9, 37.0, 112.0])
    assert figures.shape == "line"
    assert said(figures, "upwards")


def test_lack_of_fit_is_said():
    x = np.repeat([0, 1, 2, 3], 2)
    figures = calibrate(x, [0, 0.2, 14, 14.2, 16, 16.2, 34, 34.2])
    assert said(figures, "F = ")


def test_the_suspect_point_is_named_and_kept():
    x = np.arange(7.0)
    y = 10 * x + np.array([0.1, -0.2, 0.1, 30, -0.1, 0.2, 0])
    figures = calibrate(x, y)
    assert figures.suspect_point == 3
    assert said(figures, "point 4 (3 µM, 60 nA)", "kept")
    assert figures.sensitivity_na_um == fit_line(x, y).slope_na_um


def test_replicates_that_disagree_are_said_unless_noise_explains_them():
    x, y = [0, 1, 1, 2, 2], [0, 10, 14, 22, 23]
    assert said(calibrate(x, y), "replicates at 1 µM", "10 to 14 nA")
    assert not said(calibrate(x, y, noise_na=1.5), "replicates at")


def test_scatter_that_grows_is_said():
    x = np.repeat([0, 0.5, 1, 2], 4)
    assert said(calibrate(x, 20 * x + np.tile([1.0, -1.0, 0.5, -0.5], 4) * (0.1 + x)), "scatter more from 1 µM")


def test_an_intercept_that_is_no_scatter_is_said():
    assert said(calibrate(X, Y + 8), "misses zero", "background")
    assert not said(calibrate(X, Y), "misses zero")


def test_an_amplifier_at_its_limit_is_asked_about():
    assert said(calibrate([0, 0.5, 1, 2, 4], [0.1, 10, 20, 32.767, 32.767]), "amplifier", "2, 4 µM")


def test_a_range_below_the_detection_limit_is_flagged():
    assert said(calibrate(X, Y, noise_na=2.0), "begins at 0.25 µM", "below the detection limit")


def test_points_without_scatter_are_asked_about_and_give_no_limit():
    figures = calibrate([0, 1, 2, 4], [0, 10, 20, 40])
    assert figures.lod_um is None
    assert said(figures, "without any scatter")


def test_three_points_rest_on_one_degree_of_freedom():
    assert said(calibrate([0, 1, 2], [0.2, 10, 21]), "single degree of freedom")


def test_linear_ends_at_the_last_concentration_within_the_share():
    """The line is 1 + 9·c; the residuals are 0, 1, 2 and −2 nA of 9, 18, 27 and 36 nA at 1, 2, 3 and 4 µM."""
    line = fit_line([0, 1, 2, 3, 4], [0, 10, 20, 30, 35])
    assert linear_to_um(line, share=0.05) == 1.0
    assert linear_to_um(line, share=0.056) == 4.0
    assert linear_to_um(line, share=1e-6) == 1.0
    assert linear_to_um(fit_line([0, 1, 1], [0, 9, 11]), share=0.05) is None


def test_through_zero_on_request():
    figures = calibrate(X, Y, through_zero=True)
    assert (figures.shape, figures.intercept_na, figures.intercept_se_na) == ("line-through-zero", 0.0, None)
    assert figures.degrees_of_freedom == 4


def test_weights_are_used():
    weights = [1, 1, 1, 1, 0.01]
    assert calibrate(X, Y, weights=weights).sensitivity_na_um == fit_line(X, Y, weights=weights).slope_na_um


def test_a_kept_factor_says_what_is_unknown():
    figures = factor_only(12.0, 0.5, noise_na=0.1, standard_relative_uncertainty=0.05)
    assert (figures.sensitivity_na_um, figures.sensitivity_se_na_um, figures.n_points) == (12, 0.5, 0)
    assert figures.lod_um == pytest.approx(0.025)
    assert figures.sensitivity_low_na_um == pytest.approx(12 - 1.96 * np.hypot(0.5, 0.6))
    assert figures.shape is figures.linear_to_um is figures.intercept_na is None
    assert said(figures, "only the factor was kept")
    bare = factor_only(12.0)
    assert bare.sensitivity_se_na_um is bare.sensitivity_low_na_um is bare.lod_um is None


@pytest.mark.parametrize(
    ("x", "y", "words"),
    [
        ([0, -1, 2], [0, 1, 2], "point 2 is -1 µM"),
        ([0, float("nan")], [0, 1], "concentration of point 2 is nan"),
        ([0, 1], [0, float("inf")], "current of point 2 is inf"),
        ([0, 1, 2], [0, 1], "pair up"),
        ([[0, 1]], [[0, 1]], "pair up"),
    ],
)
def test_what_cannot_be_a_point_is_refused(x, y, words):
    with pytest.raises(InputError, match=words):
        calibrate(x, y)


@pytest.mark.parametrize("bad", [-0.1, float("nan"), float("inf")])
def test_noise_must_be_a_number(bad):
    with pytest.raises(InputError, match="noise"):
        calibrate(X, Y, noise_na=bad)


def test_a_noise_of_zero_is_unknown():
    assert "residual" in calibrate(X, Y, noise_na=0.0).lod_route


@given(
    st.lists(st.tuples(st.sampled_from([0, 0.1, 0.25, 0.5, 1, 2, 5]), st.integers(-50, 500)), max_size=9),
    st.sampled_from([None, 0.2]),
    st.booleans(),
)
def test_any_points_give_figures_that_are_json(points, noise_na, through_zero):
    x, y = [float(a) for a, _ in points], [b / 10 for _, b in points]
    figures = calibrate(x, y, noise_na=noise_na, through_zero=through_zero)
    json.dumps(figures.to_dict(), allow_nan=False)
    assert figures.n_points == len(points)
    assert (figures.sensitivity_na_um is None) == (not any(x))
    assert figures.lod_um is None or figures.lod_um > 0
    assert figures.sensitivity_na_um is not None or figures.warnings


@given(st.permutations(range(7)))
def test_the_order_of_points_changes_no_figure(order):
    x = np.array([0, 0.25, 0.5, 0.5, 1, 2, 2])
    y = 20 * x / (1 + 0.2 * x) + np.array([0.3, -0.2, 0.4, -0.5, 0.1, 0.2, -0.1])
    one, other = calibrate(x, y), calibrate(x[order], y[order])
    assert other.shape == one.shape
    assert other.sensitivity_na_um == pytest.approx(one.sensitivity_na_um, rel=1e-8)
    assert other.sensitivity_se_na_um == pytest.approx(one.sensitivity_se_na_um, rel=1e-7)
    assert len(other.warnings) == len(one.warnings)


def test_the_ordinary_path_loads_nothing_heavy():
    program = (
        "import sys; from electrolog.measure.calibrate import calibrate\n"
        "calibrate([0, .25, .5, 1, 2], [.3, 4.8, 10.4, 19.5, 40.1], noise_na=.05)\n"
        "calibrate([0, 0, 1, 1, 2, 2, 4, 4], [0, 1, 20, 21, 36, 35, 59, 58])\n"
        "print([name for name in sys.modules if name.split('.')[0] in ('scipy', 'pandas', 'sqlalchemy')])"
    )
    ran = subprocess.run([sys.executable, "-c", program], capture_output=True, text=True, check=True, encoding="utf-8")
    assert ran.stdout.strip() == "[]"


def test_two_points_lie_on_their_line_by_nature():
    assert not any("exactly on the line" in said for said in calibrate([0, 1], [0.1, 12.2]).warnings)


def test_a_flat_line_is_no_response_and_nothing_else():
    said = " ".join(calibrate([0, 1, 2, 4], [1.0, 1.0, 1.0, 1.0]).warnings)
    assert "no response was measured" in said
    assert "exactly on the line" not in said


@pytest.mark.parametrize("scale", [1.0, 0.01])
def test_how_far_it_is_linear_does_not_depend_on_the_slopes_size(scale):
    x = np.array([0, 0.5, 1, 2, 4])
    line = fit_line(x, scale * np.array([0.1, 6.1, 12.2, 24.0, 40.0]))
    assert linear_to_um(line, share=0.08) == linear_to_um(
        fit_line(x, np.array([0.1, 6.1, 12.2, 24.0, 40.0])), share=0.08
    )


@pytest.mark.parametrize(
    ("current_na", "slope"), [([0, 0, 0, 0], 0.0), ([3, 3, 3, 3], 0.0), ([0.5, 12.5, 24.5, 48.5], 12.0)]
)
def test_points_without_any_scatter_give_no_certainty(current_na: list[float], slope: float) -> None:
    figures = calibrate([0, 1, 2, 4], current_na)
    assert figures.sensitivity_na_um == pytest.approx(slope, abs=1e-12)
    unknown = ("sensitivity_se_na_um", "sensitivity_low_na_um", "sensitivity_high_na_um", "residual_sd_na")
    assert [getattr(figures, name) for name in unknown] == [None] * 4
    assert any("without" in text and "scatter" in text for text in figures.warnings)


def test_replicates_of_one_concentration_that_agree_are_no_dead_probe() -> None:
    assert not any("no response" in text for text in calibrate([1, 1], [5, 5]).warnings)
