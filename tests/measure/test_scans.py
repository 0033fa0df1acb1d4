"""A sheet of scans against the truth it was made from, and every way in which one can be bad."""

import numpy as np
import pytest

from electrolog.errors import DataError, InputError
from electrolog.measure.peaks import find_peaks
from electrolog.measure.recording import Span
from electrolog.measure.scans import ScanSettings, read_scans, response_map
from electrolog.measure.sweep import nearest, potentials_v
from electrolog.measure.trace import TraceSettings
from tests.measure.recordings import CONCENTRATIONS, OXIDATION_V, REDUCTION_V, SENSITIVITY, WIDTH_V, sheet

TRUE_NA = SENSITIVITY * np.array(CONCENTRATIONS)
FULL_WIDTH = 2 * WIDTH_V * np.sqrt(np.log(2))  # of exp(−(E/w)²) at half its height


@pytest.fixture(scope="module")
def made():
    return sheet()


@pytest.fixture(scope="module")
def reading(made):
    scans, potential, time, _ = made
    return read_scans(scans, potential, time)


def said(reading, *words):
    return any(all(word in text for word in words) for text in reading.warnings)


def levels(reading):
    return np.array([one.level_na for one in reading.voltammograms])


def test_injections_are_found_where_the_analyte_shows(made, reading):
    *_, starts = made
    assert reading.trace_v == pytest.approx(OXIDATION_V, abs=0.02)
    assert [one.injection.start_s for one in reading.voltammograms] == pytest.approx(starts, abs=1)
    assert levels(reading) == pytest.approx(TRUE_NA, abs=0.25, rel=0.02)
    assert reading.warnings == ()


def test_peaks_have_their_potential_height_width_and_separation(reading):
    peaks = reading.peaks
    assert peaks.oxidation.potential_v == pytest.approx(OXIDATION_V, abs=0.015)
    assert peaks.reduction.potential_v == pytest.approx(REDUCTION_V, abs=0.015)
    assert peaks.separation_v == pytest.approx(OXIDATION_V - REDUCTION_V, abs=0.03)
    assert peaks.oxidation.current_na == pytest.approx(2 * SENSITIVITY, rel=0.03)
    assert peaks.reduction.current_na == pytest.approx(-14, rel=0.03)
    assert peaks.oxidation.width_v == pytest.approx(FULL_WIDTH, rel=0.1)


def test_background_and_noise(made, reading):
    scans, potential, time, starts = made
    assert reading.charging_v == reading.trace_v
    at = nearest(potential, 0.2, upwards=True)
    stated = read_scans(scans, potential, time, ScanSettings(charging_v=0.2))
    before = (time > starts[0] - 5) & (time < starts[0] - 0.5)
    assert stated.charging_na == pytest.approx(float(scans[before][:, at].mean()), rel=0.002)
    assert reading.noise_na == pytest.approx(0.8 / np.sqrt(5), rel=0.15)  # the mean of five points


def test_a_background_that_drifts_is_carried_on():
    scans, potential, time, _ = sheet(drift=0.1)
    carried = read_scans(scans, potential, time)
    steady = read_scans(scans, potential, time, ScanSettings(drifting=False))
    assert levels(carried) == pytest.approx(TRUE_NA, abs=0.4)
    assert (levels(steady) - levels(carried) > 1).all()


def test_each_step_can_be_set_by_hand(made, reading):
    scans, potential, time, starts = made
    spans = tuple(Span(start, start + 30) for start in starts)
    settings = ScanSettings(
        trace=TraceSettings(injections=spans, plateau=(0.4, 0.8)),
        background_s=(8, 1),
        oxidation_v=0.5,
        reduction_v=-0.1,
    )
    byhand = read_scans(scans, potential, time, settings)
    assert byhand.trace_v == pytest.approx(0.5, abs=0.004)
    assert tuple(one.injection for one in byhand.voltammograms) == spans
    assert byhand.voltammograms[0].window == Span(starts[0] + 12, starts[0] + 24)
    assert byhand.voltammograms[0].background == Span(starts[0] - 8, starts[0] - 1)
    share = np.exp(-(((0.5 - OXIDATION_V) / WIDTH_V) ** 2))
    assert levels(byhand) == pytest.approx(share * TRUE_NA, abs=0.3)
    peaks = byhand.peaks
    assert peaks.oxidation.by_hand
    assert peaks.reduction.by_hand
    assert peaks.reduction.potential_v == pytest.approx(-0.1, abs=0.004)
    assert not reading.peaks.oxidation.by_hand


def test_oxidation_recorded_as_negative_is_recognised_and_turned_only_on_request(made):
    scans, potential, time, _ = made
    found = read_scans(-scans, potential, time)
    assert said(found, "is oxidation recorded as negative?")
    assert levels(found) == pytest.approx(-TRUE_NA, abs=0.3)
    turned = read_scans(-scans, potential, time, ScanSettings(trace=TraceSettings(turned=True)))
    assert levels(turned) == pytest.approx(TRUE_NA, abs=0.3)
    assert turned.peaks.oxidation.potential_v == pytest.approx(OXIDATION_V, abs=0.015)


def test_an_amplifier_at_its_limit_is_named(made):
    scans, potential, time, _ = made
    top = float(np.median(scans[:500].max(1))) - 20  # below the charging current's own top in every scan
    assert said(read_scans(np.minimum(scans, top), potential, time), "injection 4", "amplifier was at its limit")


def test_gaps_and_a_backward_clock(made):
    scans, potential, time, _ = made
    kept = (time < 20) | (time > 28)
    assert said(read_scans(scans[kept], potential, time[kept]), "gap of 8")
    back = time.copy()
    back[100:] -= 5
    with pytest.raises(InputError, match="runs backwards at sample 101"):
        read_scans(scans, potential, back)


def test_what_is_no_sheet_is_refused(made):
    scans, potential, time, _ = made
    broken = scans[:200].copy()
    broken[17, 3] = np.nan
    with pytest.raises(InputError, match="scan 18 holds nan nA at its point 4"):
        read_scans(broken, potential, time[:200])
    broken[17, 3] = 1e20
    with pytest.raises(InputError, match=r"scan 18 holds 1e\+20 nA at its point 4; accepted: finite"):
        read_scans(broken, potential, time[:200])
    whole = scans[:200].astype(np.int64)
    whole[7, 3] = np.iinfo(np.int64).min  # as which NaN comes out where numbers are made whole
    with pytest.raises(InputError, match="scan 8 holds -9"):
        read_scans(whole, potential, time[:200])
    with pytest.raises(InputError, match="two dimensions"):
        read_scans(scans[0], potential, time)
    with pytest.raises(InputError, match="500 points and 3 potentials"):
        read_scans(scans, [0, 1, 0], time)
    with pytest.raises(InputError, match="3600 scans and 100 times"):
        read_scans(scans, potential, time[:100])
    with pytest.raises(DataError, match="throughout"):
        read_scans(np.ones((200, 500)), potential, time[:200])
    with pytest.raises(InputError, match="outside the sweep"):
        read_scans(scans, potential, time, ScanSettings(oxidation_v=3.0))


def test_a_background_without_scans_is_refused(made):
    scans, potential, time, starts = made
    first = (time > starts[0] - 0.65).argmax()
    settings = ScanSettings(trace=TraceSettings(injections=(Span(starts[0], starts[0] + 20),)))
    with pytest.raises(DataError, match="where a plateau or a background is to be taken"):
        read_scans(scans[first:], potential, time[first:], settings)


def test_a_sheet_without_a_peak_says_so(made):
    """A capacitive step, alike at all potentials of the rising sweep."""
    _, potential, time, starts = made
    step = 5.0 * ((time > starts[0]) & (time < starts[0] + 30))
    flat = 100 + step[:, None] + np.random.default_rng(1).normal(0, 0.1, (time.size, 500))
    assert said(read_scans(flat, potential, time), "no oxidation peak")


def test_a_mapped_file_gives_the_same_as_an_array(made, reading, tmp_path):
    scans, potential, time, _ = made
    np.save(tmp_path / "sheet.npy", scans)
    mapped = read_scans(np.load(tmp_path / "sheet.npy", mmap_mode="r"), potential, time)
    assert levels(mapped).tolist() == levels(reading).tolist()


def test_the_picture_shows_the_change_since_the_first_background(made, reading):
    change, times = response_map(made[0], reading, most_columns=300)
    assert change.shape == (len(times), 500)
    at = nearest(reading.potential_v, OXIDATION_V, upwards=True)
    last = reading.voltammograms[-1].window
    assert change[last.within(times), at].mean() == pytest.approx(2 * SENSITIVITY, abs=4)


def test_potentials_follow_from_the_vertices():
    sweep = potentials_v((0.2, 1.0, -0.1, 0.2), 23)
    assert sweep[[0, 8, 19, 22]] == pytest.approx([0.2, 1.0, -0.1, 0.2], abs=1e-12)
    assert np.abs(np.diff(sweep)) == pytest.approx(0.1)
    with pytest.raises(InputError, match="no sweep"):
        potentials_v((0.3, 0.3), 100)


def test_a_peak_must_stand_clear_of_the_noise():
    potential = potentials_v((-0.4, 1.3, -0.4), 500)
    random = np.random.default_rng(2)
    for _ in range(50):
        peaks = find_peaks(potential, random.normal(0, 1, 500), 1.0)
        assert peaks.oxidation is peaks.reduction is peaks.separation_v is None


def test_a_sheet_beyond_all_measure_is_refused_before_it_is_read(made):
    class Endless:
        shape = (2_000_000, 1000)

        def __getitem__(self, rows):
            raise AssertionError("nothing may be read")

    with pytest.raises(InputError, match="2000000000 samples are too many at once"):
        read_scans(Endless(), made[1], made[2])


def test_a_short_recording_is_drawn_scan_by_scan(made, reading):
    change, times = response_map(made[0][:600], reading)
    assert (change.shape, len(times)) == ((600, 500), 600)
