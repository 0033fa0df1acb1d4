"""The cohort fit beside mixed models of others, which do less: one straight line, where ours weighs every shape."""

from __future__ import annotations

import csv
import json
import math
import shutil
import subprocess
import sys
import warnings
from collections.abc import Iterator
from pathlib import Path
from typing import Any

import numpy as np

from electrolog.fouling.cohort import fit_cohort
from electrolog.fouling.events import READING, Events
from tests.bench import labs
from tests.bench.line import Aim, Family, Line, left_out, ratio
from tests.bench.timing import ONE_THREAD, Taken, by_turns
from tests.fouling.fleets.simulate import Fleet, fleet, walk

PROBES, SIZES = 10_000, (1000, 10_000, 100_000)
WORK = "cohort fit, all shapes, 10⁴ probes with days"
LME4 = "R lme4: one straight line, levels and slopes, crossed days"
MIXED = "statsmodels MixedLM: one straight line, levels and slopes, no days"
LOOP = "loop of scipy curve_fit: one exponential a probe, no cohort"
CROSSED = Path(__file__).with_name("crossed.R")


def beside_others() -> Iterator[Line]:
    """Each peer is handed its numbers as it wants them; reading and laying them out is not timed."""
    found = fleet(labs.FAMILY, labs.SEED, PROBES)
    table = _table(found)
    works = {
        WORK: lambda: fit_cohort(found.events),
        MIXED: lambda: _mixed(table),
        LOOP: lambda: _loop(table),
        **_lme4(table),
    }
    taken = by_turns(works, warm=0)
    if LME4 in taken:
        yield ratio(WORK, LME4, taken[WORK], taken[LME4], 1)
    else:
        yield left_out(WORK, LME4, Aim(1), "R with lme4 isn't there: apt install r-cran-lme4")
    yield ratio(WORK, MIXED, taken[WORK], taken[MIXED], 0.3)
    yield ratio(WORK, LOOP, taken[WORK], taken[LOOP], 3)


def _table(found: Fleet) -> dict[str, np.ndarray[Any, Any]]:
    """The readings: log sensitivity, hours of fouling in tens before each, unit and day."""
    events: Events = found.events
    at = np.flatnonzero(events.kind == READING)
    hours = walk(found.truth.generator, events).clock_h[at] / 10
    return {"y": events.amount[at], "hours": hours, "unit": events.unit[at], "day": events.which[at]}


def _mixed(table: dict[str, np.ndarray[Any, Any]]) -> None:
    from statsmodels.regression.mixed_linear_model import MixedLM

    design = np.column_stack([np.ones(table["y"].size), table["hours"]])
    with warnings.catch_warnings():
        warnings.simplefilter("ignore")  # of a variance at zero: the time is asked, not the answer
        MixedLM(table["y"], design, table["unit"], exog_re=design).fit(reml=True)


def _loop(table: dict[str, np.ndarray[Any, Any]]) -> None:
    """Level and rate of each probe by itself; probes with one reading can't have it and are passed over."""
    from scipy.optimize import curve_fit

    ends = np.flatnonzero(np.diff(table["unit"])) + 1
    with warnings.catch_warnings():
        warnings.simplefilter("ignore")  # of two readings that leave no error to be told
        for hours, y in zip(np.split(table["hours"], ends), np.split(table["y"], ends), strict=True):
            if len(set(hours)) > 1:
                curve_fit(_exponential, hours, np.exp(y), p0=(math.exp(y[0]), 0.1), maxfev=2000)


def _exponential(hours: Any, level: float, rate: float) -> Any:
    return level * np.exp(-rate * hours)


def _lme4(table: dict[str, np.ndarray[Any, Any]]) -> dict[str, Any]:
    if shutil.which("Rscript") is None or _r(["-e", "library(lme4)"]).returncode:
        return {}
    path = labs.scratch() / "readings.csv"
    with path.open("w", encoding="utf-8", newline="") as stream:
        writer = csv.writer(stream)
        writer.writerow(table)
        writer.writerows(zip(*(column.tolist() for column in table.values()), strict=True))
    return {LME4: lambda: float(_r([str(CROSSED), str(path), "1"]).stdout)}


def _r(arguments: list[str]) -> subprocess.CompletedProcess[str]:
    return subprocess.run(["Rscript", *arguments], check=False, capture_output=True, encoding="utf-8")


def growing() -> Iterator[Line]:
    """Once each: the largest takes minutes, and a hundredfold of probes dwarfs what a busy moment adds."""
    found = [_alone(size) for size in SIZES]
    seconds = [one["seconds"] for one in found]
    exponent = math.log(seconds[-1] / seconds[0]) / math.log(SIZES[-1] / SIZES[0])
    said = ", ".join(f"{size:,}: {taken:.3g} s" for size, taken in zip(SIZES, seconds, strict=True))
    ours = Taken((seconds[-1],))
    yield Line("cohort fit from 10³ to 10⁵ probes: exponent of its time", "", ours, None, exponent, Aim(1.1, ""), said)
    peak = found[-1]["peak_gb"]
    if peak is None:
        yield left_out("its peak memory", "", Aim(2, "GB"), "this system doesn't say what a process has held")
    else:
        yield Line("its peak memory at 10⁵ probes", "", None, None, peak, Aim(2, "GB"))


def _alone(probes: int) -> dict[str, Any]:
    import os

    command = [sys.executable, "-m", "tests.bench.one_fit", str(probes)]
    done = subprocess.run(command, check=True, capture_output=True, encoding="utf-8", env={**os.environ, **ONE_THREAD})
    said: dict[str, Any] = json.loads(done.stdout)
    return said


FAMILIES = (Family("cohort", beside_others, heavy=True), Family("growth", growing, heavy=True))
