"""Two runs as a rig leaves them: currents at the peak in CSV, and the list that says what such files can't."""

from __future__ import annotations

import csv
import math
from pathlib import Path
from random import Random

LIST = """\
file,probe,start,subject,setting,waveform,by
R0119.csv,B09-01,2026-11-02T10:00:00+00:00,animal-070,in-vivo,triangle,wren
R0120.csv,B09-02,2026-11-02T15:10:00+00:00,slice-012,slice,triangle,finch
"""
LENGTHS_S = {"R0119": 12_600, "R0120": 3_600}
STEP_S = 10
START_NA_UM, END_NA_UM, OFFSET_NA, NOISE_NA = 12.8, 10.4, 0.09, 0.09  # what B09-01 was calibrated to before and after
REST_UM, RELEASE_UM, EVERY_S, CLEARED_S = 0.1, 0.4, 900, 60.0  # a release every quarter of an hour, taken up again


def write_recordings(folder: Path) -> None:
    folder.mkdir(parents=True, exist_ok=True)
    (folder / "recordings.csv").write_text(LIST, encoding="utf-8", newline="")
    for name, length_s in LENGTHS_S.items():
        with (folder / f"{name}.csv").open("w", encoding="utf-8", newline="") as file:
            writer = csv.writer(file)
            writer.writerow(("time_s", "current_na"))
            writer.writerows(_samples(length_s, Random(name)))  # noqa: S311 -- the same on every machine is wanted


def _samples(length_s: int, noise: Random) -> list[tuple[int, str]]:
    rate = math.log(END_NA_UM / START_NA_UM) / length_s
    return [(t, f"{_current_na(t, rate) + noise.gauss(0, NOISE_NA):.3f}") for t in range(0, length_s + 1, STEP_S)]


def _current_na(time_s: int, rate: float) -> float:
    concentration_um = REST_UM + RELEASE_UM * math.exp(-(time_s % EVERY_S) / CLEARED_S)
    return OFFSET_NA + START_NA_UM * math.exp(rate * time_s) * concentration_um
