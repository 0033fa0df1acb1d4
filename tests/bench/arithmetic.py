"""Numerics that a lab waits for: many calibration lines, and half an hour of scans."""

from __future__ import annotations

from collections.abc import Iterator
from pathlib import Path
from typing import Any

import numpy as np

from electrolog.answers.signal_files import scans_from
from electrolog.measure.line import fit_lines
from electrolog.measure.scans import read_scans
from tests.bench import labs
from tests.bench.line import AT_LEAST, Family, Line, ratio
from tests.bench.timing import Taken, by_turns
from tests.measure import recordings

LINES, ONE_BY_ONE = 100_000, 1000  # a loop's time grows with its length, so a part of it tells the whole
LEVELS_UM = np.array(labs.LEVELS_UM)
SCANS, POINTS, RATE_HZ = 18_000, 1000, 10  # half an hour


def many_lines() -> Iterator[Line]:
    from scipy.stats import linregress
    from statsmodels.api import WLS, add_constant

    currents = 20 * LEVELS_UM + np.random.default_rng(0).normal(0, 0.5, (LINES, LEVELS_UM.size))
    design, weights = add_constant(LEVELS_UM), np.ones(LEVELS_UM.size)
    taken = by_turns(
        {
            "ours": lambda: fit_lines(LEVELS_UM, currents),
            "linregress": lambda: [_errors(linregress(LEVELS_UM, row)) for row in currents[:ONE_BY_ONE]],
            "WLS": lambda: [WLS(row, design, weights=weights).fit().bse for row in currents[:ONE_BY_ONE]],
        }
    )
    for name, peer in (("linregress", "loop of scipy.stats.linregress"), ("WLS", "loop of statsmodels WLS")):
        whole = Taken(*(tuple(part * LINES / ONE_BY_ONE for part in both) for both in vars(taken[name]).values()))
        yield ratio("10⁵ calibration lines with errors", peer, taken["ours"], whole, 50, AT_LEAST)


def _errors(found: Any) -> tuple[float, float, float, float]:
    return found.slope, found.stderr, found.intercept, found.intercept_stderr


def half_an_hour() -> Iterator[Line]:
    path, potential = _sheet()
    time = np.arange(SCANS) / RATE_HZ
    taken = by_turns(
        {
            "ours": lambda: read_scans(scans_from(path).sheet, potential, time),
            "mean": lambda: np.load(path).mean(axis=0),
        }
    )
    work = "raw scans, 30 min × 10 Hz × 1,000 points, to voltammograms and peaks"
    yield ratio(work, "numpy.load and the mean of each point, same file", taken["ours"], taken["mean"], 4)


def _sheet() -> tuple[Path, Any]:
    """Two calibrations of four injections in one file."""
    scans, potential, _, _ = recordings.sheet(seconds=SCANS // RATE_HZ // 2, points=POINTS)
    path = labs.scratch() / "scans.npy"
    np.save(path, np.tile(scans.astype(np.float32), (2, 1)))
    return path, potential


FAMILIES = (Family("lines", many_lines), Family("scans", half_an_hour))
