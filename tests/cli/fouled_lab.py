"""An invented lab whose probes foul by a law that is known, as an exchange folder.

log sensitivity = level - rate * hours in vivo; a day of calibration is shared by probes early and late in their lives,
so that a weak standard, as on one day, can be told from fouling. Level, rate, day and reading scatter as stated. R1 and
R2 keep raw points, one straight, one saturating.
"""

from __future__ import annotations

import csv
from datetime import UTC, datetime, timedelta
from pathlib import Path
from typing import Any

import numpy as np

LEVEL, LEVEL_SD = float(np.log(10.0)), 0.25
RATE, RATE_SD = 0.06, 0.3
DAY_SD, READING_SD, LINE_SE = 0.02, 0.03, 0.01
GROUPS, PER_GROUP, ROUNDS = 8, 4, 4
BAD_DAY, WEAK = 7, float(np.log(0.85))
DAYS = 2 * GROUPS + ROUNDS - 2
FIRST = datetime(2026, 1, 5, 9, tzinfo=UTC)
BACKGROUND_NA, FOLLOWS, BACKGROUND_SD = 150.0, 0.5, 0.01  # log background falls by this share of the log sensitivity
BETWEEN_DAYS = timedelta(days=3)
LEVELS_UM = (0.0, 0.25, 0.5, 1.0, 2.0, 4.0)
AFFINITY_PER_UM = 0.25

Rows = dict[str, list[dict[str, Any]]]


def fouled_lab(folder: Path, seed: int = 6) -> dict[str, tuple[float, float]]:
    """Writes the folder; returns each probe's true level and rate."""
    rng = np.random.default_rng(seed)
    rows: Rows = {name: [] for name in ("electrodes", "calibrations", "exposures", "calibration_points")}
    truth = {}
    days = rng.normal(0.0, DAY_SD, DAYS)
    other = np.random.default_rng(seed + 1)
    days[BAD_DAY] = WEAK
    for group in range(GROUPS):
        names = [f"G{group}-{k}" for k in range(PER_GROUP)]
        for name in names:
            truth[name] = (rng.normal(LEVEL, LEVEL_SD), RATE * np.exp(rng.normal(0.0, RATE_SD)))
            rows["electrodes"].append({"electrode": name})
        _write_group(rows, 2 * group, days, {name: truth[name] for name in names}, rng, other)
    for name, affinity in (("R1", 0.0), ("R2", AFFINITY_PER_UM)):
        truth[name] = (LEVEL, RATE)
        rows["electrodes"].append({"electrode": name})
        _write_with_points(rows, name, affinity)
    folder.mkdir(exist_ok=True)
    for name, found in rows.items():
        with (folder / f"{name}.csv").open("w", encoding="utf-8", newline="") as file:
            writer = csv.DictWriter(file, list(dict.fromkeys(key for row in found for key in row)))
            writer.writeheader()
            writer.writerows(found)
    return truth


def _write_group(
    rows: Rows,
    first_day: int,
    days: np.ndarray,
    truth: dict[str, tuple[float, float]],
    rng: np.random.Generator,
    other: np.random.Generator,
) -> None:
    hours = dict.fromkeys(truth, 0.0)
    for turn in range(ROUNDS):
        at = FIRST + (first_day + turn) * BETWEEN_DAYS
        for name, (level, rate) in truth.items():
            reading = level - rate * hours[name] + days[first_day + turn] + rng.normal(0.0, READING_SD)
            row = calibration(
                name, turn, at, sensitivity_na_um=np.exp(reading), standard_error=LINE_SE * np.exp(reading)
            )
            strays = other.normal(0.0, BACKGROUND_SD)
            background_na = BACKGROUND_NA * np.exp(-FOLLOWS * rate * hours[name] + strays)
            rows["calibrations"].append({**row, "background_na": round(background_na, 3)})
            length = float(rng.uniform(1.5, 5.0))
            hours[name] += length
            if turn < ROUNDS - 1:
                rows["exposures"].append(exposure(name, at + timedelta(hours=2), length))


def _write_with_points(rows: Rows, name: str, affinity_per_um: float) -> None:
    """Calibrated, four hours in vivo, calibrated: without a scatter that a test would have to allow for."""
    start = FIRST + DAYS * BETWEEN_DAYS
    for turn, (hours_on, sensitivity) in enumerate(((0, np.exp(LEVEL)), (8, np.exp(LEVEL - 4 * RATE)))):
        row = calibration(name, turn, start + timedelta(hours=hours_on))
        rows["calibrations"].append({**row, "noise_na": 0.05, "stage": ("pre", "post")[turn]})
        for place, level_um in enumerate(LEVELS_UM):
            current = sensitivity * level_um / (1 + affinity_per_um * level_um)
            wobble = 0.02 * (-1) ** place
            point = {"concentration_um": level_um, "current_na": round(current + wobble, 4)}
            rows["calibration_points"].append({"calibration": row["calibration"], **point})
    rows["exposures"].append({**exposure(name, start + timedelta(hours=2), 4.0), "recording": f"rec-{name}"})


def calibration(
    name: str, turn: int, at: datetime, sensitivity_na_um: float | None = None, standard_error: float | None = None
) -> dict[str, Any]:
    return {
        "calibration": f"{name}/{turn}",
        "electrode": name,
        "at": at.isoformat(),
        "stage": "pre" if turn == 0 else "interim",
        "analyte": "dopamine",
        "waveform": "triangle",
        "noise_na": "",
        "sensitivity_na_um": "" if sensitivity_na_um is None else round(sensitivity_na_um, 4),
        "sensitivity_se_na_um": "" if standard_error is None else round(standard_error, 4),
    }


def exposure(name: str, start: datetime, hours: float) -> dict[str, Any]:
    return {
        "electrode": name,
        "start": start.isoformat(),
        "duration_min": round(hours * 60, 3),
        "setting": "in-vivo",
        "waveform": "triangle",
        "recording": "",
    }
