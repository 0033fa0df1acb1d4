"""Half an hour of scans, and recordings of millions of samples, within seconds and far below the memory there is."""

import time as clock
import tracemalloc

import numpy as np
import pytest

from electrolog.measure.scans import read_scans
from electrolog.measure.trace import read_trace
from tests.measure import recordings


@pytest.fixture(scope="module")
def half_an_hour(tmp_path_factory):
    """18,000 scans of 1,000 points at 10 Hz, mapped from a file: 18 million samples."""
    scans, potential, _, _ = recordings.sheet(seconds=180, points=1000)
    path = tmp_path_factory.mktemp("scans") / "sheet.npy"
    sheet = np.lib.format.open_memmap(path, mode="w+", dtype=np.float32, shape=(18_000, 1000))
    for first in range(0, 18_000, 1800):
        sheet[first : first + 1800] = scans
    sheet.flush()
    return np.load(path, mmap_mode="r"), potential, np.arange(18_000) / 10


def test_half_an_hour_of_scans(half_an_hour):
    sheet, potential, time = half_an_hour
    read_scans(sheet[:2000], potential, time[:2000])  # loads what is imported where it is used
    began = clock.perf_counter()
    reading = read_scans(sheet, potential, time)
    assert clock.perf_counter() - began < 3
    assert len(reading.voltammograms) == 40
    assert reading.trace_v == pytest.approx(recordings.OXIDATION_V, abs=0.02)


def test_half_an_hour_of_scans_is_read_in_stretches(half_an_hour):
    tracemalloc.start()
    read_scans(*half_an_hour)
    peak = tracemalloc.get_traced_memory()[1]
    tracemalloc.stop()
    assert peak < 0.3e9


def test_a_trace_of_two_million_samples():
    time, current, starts = recordings.trace(rate_hz=5000)
    assert time.size > 2e6
    began = clock.perf_counter()
    reading = read_trace(time, current)
    assert clock.perf_counter() - began < 3
    assert [one.injection.start_s for one in reading.plateaus] == pytest.approx(starts, abs=1)
