"""A flow-cell recording against the truth it was made from, and every way in which one can be bad."""

import numpy as np
import pytest

from electrolog.errors import DataError, InputError
from electrolog.measure.drift import scatter_about_line
from electrolog.measure.recording import Span
from electrolog.measure.trace import TraceSettings, read_trace
from tests.measure.recordings import CONCENTRATIONS, SENSITIVITY, trace

TRUE_NA = SENSITIVITY * np.array(CONCENTRATIONS)


def said(reading, *words):
    return any(all(word in text for word in words) for text in reading.warnings)


def levels(reading):
    return np.array([one.level_na for one in reading.plateaus])


@pytest.mark.parametrize(
    "made",
    [
        {},
        {"noise_na": 0.4},
        {"drift": (5, 0.05, 1e-4)},
        {"drift": (-3, -0.04, 0)},
        {"rate_hz": 2},
        {"rate_hz": 500},
        {"lasts": 15, "pause": 40},
        {"rise_s": 0.5, "fall_s": 8},
        {"concentration": (0.1, 3.0, 0.1, 1.0)},
    ],
)
def test_injections_and_their_plateaus_are_found(made):
    time, current, starts = trace(**made)
    reading = read_trace(time, current)
    lasts, noise = made.get("lasts", 30), made.get("noise_na", 0.08)
    assert [one.injection.start_s for one in reading.plateaus] == pytest.approx(starts, abs=1)
    assert [one.injection.end_s for one in reading.plateaus] == pytest.approx(starts + lasts, abs=1.5)
    true = SENSITIVITY * np.array(made.get("concentration", CONCENTRATIONS))
    assert levels(reading) == pytest.approx(true, rel=0.015, abs=noise)
    assert reading.noise_na == pytest.approx(noise, rel=0.1)
    if lasts > 20:  # on a shorter plateau the current still rises
        assert reading.plateaus[-1].noise_na == pytest.approx(noise, rel=0.2)


def test_hundred_random_recordings_are_read_or_warned_of():
    random, missed = np.random.default_rng(11), 0
    for seed in range(100):
        made = {"noise_na": 10 ** random.uniform(-2, -0.5), "rise_s": random.uniform(0.3, 4)}
        made |= {"fall_s": random.uniform(1, 10), "lasts": random.uniform(20, 60), "pause": random.uniform(50, 90)}
        time, current, _ = trace(**made, drift=random.normal(0, (3, 0.01, 1e-5)), seed=seed)
        reading = read_trace(time, current)
        good = len(reading.plateaus) == 4 and np.allclose(levels(reading), TRUE_NA, rtol=0.05, atol=0.3)
        assert good or reading.warnings
        missed += not good
    assert missed <= 1


def test_rise_and_fall_times_are_those_of_an_exponential():
    """From 10 to 90 % an exponential takes ln 9 time constants."""
    time, current, _ = trace(noise_na=0.02, rise_s=2, fall_s=5)
    reading = read_trace(time, current)
    for one in reading.plateaus:
        assert one.rise_s == pytest.approx(2 * np.log(9), rel=0.06)
        assert one.fall_s == pytest.approx(5 * np.log(9), rel=0.06)
        assert one.tailing == pytest.approx(2.5, rel=0.1)
    assert not said(reading, "clings")


def test_a_long_tail_is_remarked_on():
    time, current, _ = trace(rise_s=1, fall_s=8)
    assert said(read_trace(time, current), "injection 4", "clings to the carbon")


def test_points_pair_with_concentrations_in_order():
    time, current, _ = trace()
    reading = read_trace(time, current)
    assert reading.points((2, 2, 1, 1)) == tuple(zip((2.0, 2.0, 1.0, 1.0), levels(reading), strict=True))
    with pytest.raises(InputError, match=r"4 injections .* 3 concentrations"):
        reading.points((1, 2, 3))


def test_a_table_goes_before_what_would_be_found():
    time, current, starts = trace()
    spans = tuple(Span(start, start + 30) for start in starts[1:])
    reading = read_trace(time, current, TraceSettings(injections=spans))
    assert tuple(one.injection for one in reading.plateaus) == spans
    # The injection that the table leaves out stands in what is taken for rest; later plateaus bear it.
    assert levels(reading)[1:] == pytest.approx(TRUE_NA[2:], rel=0.1)


def test_plateau_and_baseline_can_be_set_by_hand():
    time, current, _ = trace(noise_na=0.01, rise_s=8, drift=(0, 0.02, 0))
    early = read_trace(time, current, TraceSettings(plateau=(0.1, 0.3)))
    late = read_trace(time, current, TraceSettings(plateau=(0.8, 0.95)))
    assert (levels(early) < 0.8 * levels(late)).all()
    assert late.plateaus[0].window.length_s == pytest.approx(0.15 * late.plateaus[0].injection.length_s)
    flat = read_trace(time, current, TraceSettings(baseline_degree=0))
    assert flat.corrected_na[:50].mean() < -2
    assert abs(read_trace(time, current).corrected_na[:50].mean()) < 0.1
    assert said(early, "no plateau yet")


@pytest.mark.parametrize("settings", [{"plateau": (0.9, 0.5)}, {"plateau": (0, 1.2)}, {"baseline_degree": 9}])
def test_settings_out_of_range_are_refused(settings):
    with pytest.raises(InputError, match="accepted"):
        TraceSettings(**settings)


def test_oxidation_recorded_as_negative_is_recognised_and_turned_only_on_request():
    time, current, _ = trace()
    found = read_trace(time, -current)
    assert said(found, "is oxidation recorded as negative?", "Nothing was turned")
    assert levels(found) == pytest.approx(-TRUE_NA, rel=0.02)
    turned = read_trace(time, -current, TraceSettings(turned=True))
    assert not turned.warnings
    assert levels(turned) == pytest.approx(TRUE_NA, rel=0.02)


def test_time_that_runs_backwards_is_refused_at_its_sample():
    time, current, _ = trace()
    time[300:] -= 20
    with pytest.raises(InputError, match="runs backwards at sample 301"):
        read_trace(time, current)
    time, current, _ = trace()
    time[300] = time[299]
    with pytest.raises(InputError, match="stands still at sample 301"):
        read_trace(time, current)


def test_a_gap_is_named_and_within_a_plateau_named_there():
    time, current, starts = trace()
    kept = (time < 20) | (time > 30)
    reading = read_trace(time[kept], current[kept])
    assert said(reading, "gap of 10.2 s at 19.9 s")
    assert not said(reading, "plateau")
    assert levels(reading) == pytest.approx(TRUE_NA, rel=0.02)
    kept = (time < starts[1] + 18) | (time > starts[1] + 22)
    assert said(read_trace(time[kept], current[kept]), "injection 2", "gap within its plateau")


def test_a_fall_hidden_by_a_gap_has_no_length():
    time, current, starts = trace()
    kept = (time < starts[1] + 31) | (time > starts[1] + 60)
    reading = read_trace(time[kept], current[kept])
    assert reading.plateaus[1].fall_s is None
    assert reading.plateaus[0].fall_s is not None
    assert said(reading, "injection 2", "isn't seen to come back")
    assert not said(reading, "clings")


def test_an_amplifier_at_its_limit_is_named_at_its_injection():
    time, current, _ = trace(drift=(0,))
    reading = read_trace(time, np.minimum(current, 20))
    assert said(reading, "injection 4", "amplifier was at its limit")
    assert not said(reading, "injection 3")
    assert not said(reading, "clings")
    assert not said(read_trace(time, current), "amplifier")


def test_overlapping_injections_are_named():
    """The second begins before the first has ended: a staircase."""
    time = np.arange(0, 240, 0.1)
    steps = 6.0 * (time > 60) + 6.0 * (time > 110) - 12.0 * (time > 160)
    current = steps + np.random.default_rng(1).normal(0, 0.05, time.size)
    reading = read_trace(time, current)
    assert said(reading, "injections 1 and 2 overlap")
    assert levels(reading) == pytest.approx([6, 12], rel=0.02)
    with pytest.raises(InputError, match="injections 1 and 2 overlap"):
        read_trace(time, current, TraceSettings(injections=(Span(60, 120), Span(110, 160))))


def test_a_tail_too_slow_for_an_edge_mostly_ends_its_injection_and_else_is_warned_of():
    """The first fall is hidden in the noise, a third of its height, and in a drift upwards."""
    right = 0
    for seed in range(30):
        made = {"noise_na": 0.9, "rise_s": 1, "fall_s": 9, "lasts": 35, "pause": 90, "drift": (0, 0.02, 0)}
        time, current, starts = trace((0.25, 2.0), **made, seed=seed)
        reading = read_trace(time, current)
        near = abs(reading.plateaus[0].injection.end_s - starts[0] - 35) < 8
        assert near or said(reading, "injections 1 and 2 overlap")
        right += near
    assert right >= 20


def test_a_recording_that_ends_within_an_injection_says_so():
    time, current, starts = trace()
    kept = time < starts[-1] + 25
    assert said(read_trace(time[kept], current[kept]), "ends within injection 4")


def test_noise_alone_holds_no_injection():
    random = np.random.default_rng(5)
    for _ in range(40):
        current = random.normal(0, 0.1, 6000) + np.linspace(0, random.normal(), 6000)
        with pytest.raises(DataError, match="no injection stands out"):
            read_trace(np.arange(6000) / 10, current)


@pytest.mark.parametrize(
    ("time", "current", "error", "words"),
    [
        (np.arange(10.0), np.arange(10.0), InputError, "10 samples are no recording"),
        (np.arange(100.0), np.arange(99.0), InputError, "don't pair up"),
        (np.arange(100.0), np.where(np.arange(100) == 7, np.nan, 1.0), InputError, "current of sample 8 is nan"),
        (
            np.arange(100.0),
            np.where(np.arange(100) == 7, -1e200, 1.0),
            InputError,
            r"current of sample 8 is -1e\+200 nA",
        ),
        (np.where(np.arange(100) == 99, 1e200, np.arange(100.0)), np.ones(100), InputError, r"sample 100 is 1e\+200 s"),
        (np.where(np.arange(100) == 7, np.inf, np.arange(100.0)), np.arange(100.0), InputError, "time of sample 8"),
        (np.arange(100.0), np.ones(100), DataError, "1 nA throughout"),
        (np.arange(30.0), np.random.default_rng(0).normal(size=30), DataError, "too short"),
    ],
)
def test_what_is_no_recording_is_refused(time, current, error, words):
    with pytest.raises(error, match=words):
        read_trace(time, current)


@pytest.mark.parametrize("span", [Span(-5, 20), Span(50, 40), Span(400, 900)])
def test_an_injection_outside_the_recording_is_refused(span):
    time, current, _ = trace()
    with pytest.raises(InputError, match="injection 1 runs from"):
        read_trace(time, current, TraceSettings(injections=(span,)))


def test_scale_and_offset_change_nothing_but_scale():
    time, current, _ = trace()
    plain, scaled = read_trace(time, current), read_trace(time + 1000, 3 * current + 50)
    assert levels(scaled) == pytest.approx(3 * levels(plain), rel=1e-6)
    assert [one.rise_s for one in scaled.plateaus] == pytest.approx([one.rise_s for one in plain.plateaus], rel=1e-4)


def test_rise_and_fall_are_read_between_the_samples():
    """From a tenth to nine tenths an exponential takes τ·ln 9: to a percent, with half a second between samples."""
    time, current, _ = trace(rate_hz=2, noise_na=1e-4, rise_s=2, fall_s=5, drift=(0, 0, 0), concentration=(1, 2, 1, 2))
    for one in read_trace(time, current).plateaus:
        assert one.rise_s == pytest.approx(2 * np.log(9), rel=0.01)
        assert one.fall_s == pytest.approx(5 * np.log(9), rel=0.01)


def test_noise_is_what_is_left_of_a_line_by_least_squares():
    time, current = np.array([0.0, 1.0, 2.5, 4.0]), np.array([1.0, 1.3, 0.7, 1.9])
    left = current - np.polyval(np.polyfit(time, current, 1), time)
    assert scatter_about_line(time, current) == pytest.approx(np.sqrt(left @ left / (4 - 2)))
