"""Labs of known size to ask questions of, made once a run and kept in a folder that is thrown away."""

from __future__ import annotations

import atexit
import csv
import random
import shutil
import sqlite3
import tempfile
from contextlib import closing
from dataclasses import replace
from datetime import UTC, date, datetime, timedelta
from functools import cache
from pathlib import Path

from electrolog.fouling.events import Events
from electrolog.lab import Lab, open_lab
from tests.answers.fleet_folder import ANALYTE, WAVEFORM, write_fleet
from tests.fouling.fleets.simulate import fleet

FAMILY, SEED = "exponential", 7
LAST_DAY = date(2025, 12, 31)
RUN = ("--analyte", ANALYTE, "--waveform", WAVEFORM, "--setting", "in-vivo", "--run", "2h")
LEVELS_UM = (0.0, 0.25, 0.5, 1.0, 2.0)
PROBES_OF_IMPORT, CALIBRATIONS_EACH = 10_000, 10


@cache
def scratch() -> Path:
    folder = Path(tempfile.mkdtemp(prefix="electrolog-bench-"))
    atexit.register(shutil.rmtree, folder, ignore_errors=True)
    return folder


@cache
def lab_file(probes: int) -> Path:
    """A record of so many probes, read two to seven times each, its figures and its fit kept."""
    file = scratch() / f"{probes}.db"
    folder = scratch() / f"folder-{probes}"
    write_fleet(in_the_past(fleet(FAMILY, SEED, probes).events), folder, points=True)
    lab = open_lab(str(file), create=True)
    lab.import_folder(folder)
    lab.recompute()
    lab.cohort_fit(ANALYTE)
    return file


def in_the_past(events: Events) -> Events:
    """A large fleet's years would reach beyond today, and of a probe from the future nothing can be said or kept."""
    back = date.fromisoformat(max(events.days)) - LAST_DAY
    return replace(events, days=tuple((date.fromisoformat(day) - back).isoformat() for day in events.days))


def opened(file: Path) -> Lab:
    return open_lab(str(file))


def first_probe(file: Path) -> str:
    return str(opened(file).rows("electrodes")[0]["electrode"])


def copied(file: Path, name: str) -> Path:
    """The same record in another file, for whoever adds to it."""
    other = scratch() / name
    for old in scratch().glob(f"{name}*"):
        old.unlink()
    with closing(sqlite3.connect(file)) as source:
        source.execute("VACUUM INTO ?", (str(other),))
    with closing(sqlite3.connect(other)) as target:
        target.execute("PRAGMA journal_mode = WAL")
    return other


@cache
def import_folder() -> Path:
    """10⁵ calibrations with five points each, of 10⁴ probes, in the exchange folder's files."""
    folder = scratch() / "exchange"
    folder.mkdir()
    dice = random.Random(SEED)  # noqa: S311 -- no secret
    labels = [f"P{number:05d}" for number in range(PROBES_OF_IMPORT)]
    _write(folder / "electrodes.csv", ["electrode", "exposed_length_um"], [[label, 100] for label in labels])
    first = datetime(2025, 1, 6, 8, tzinfo=UTC)
    calibrations, points = [], []
    for number in range(PROBES_OF_IMPORT * CALIBRATIONS_EACH):
        name, at = f"C{number:06d}", (first + timedelta(minutes=7 * number)).isoformat()
        noise = round(dice.uniform(0.02, 0.1), 4)
        calibrations.append([name, labels[number % len(labels)], at, "interim", ANALYTE, WAVEFORM, noise, "north"])
        slope = dice.uniform(5, 40)
        points += [[name, level, round(slope * level + dice.gauss(0, 0.05), 4)] for level in LEVELS_UM]
    _write(folder / "calibrations.csv", CALIBRATION_COLUMNS, calibrations)
    _write(folder / "calibration_points.csv", ["calibration", "concentration_um", "current_na"], points)
    return folder


CALIBRATION_COLUMNS = ["calibration", "electrode", "at", "stage", "analyte", "waveform", "noise_na", "rig"]


def _write(path: Path, header: list[str], rows: list[list[object]]) -> None:
    with path.open("w", encoding="utf-8", newline="") as stream:
        csv.writer(stream).writerows([header, *rows])
