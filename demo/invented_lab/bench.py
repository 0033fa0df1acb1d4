"""What the lab reads when it calibrates: the truth, seen through a standard, a rig and noise."""

from __future__ import annotations

import math
import random
from dataclasses import dataclass, field
from datetime import date, datetime, timedelta

from .folder import Cell, Row
from .probe import Probe
from .truth import TRUTH, dice
from .workdays import Bookings, at

SHORT = {"dopamine": "DA", "serotonin": "5HT"}
MEDIUM = {"dopamine": "tris buffer", "serotonin": "PBS"}
READING = TRUTH["reading"]


@dataclass
class Calibration:
    row: Row
    points: list[tuple[float, float]]  # stated concentration in µM, current in nA
    at: datetime
    standard: str
    true_sensitivity_na_um: float
    read_sensitivity_na_um: float  # what a line through noiseless points would give


@dataclass
class Bench:
    seed: int
    bookings: Bookings = field(default_factory=Bookings)
    calibrations: list[Calibration] = field(default_factory=list)
    standards: dict[str, Row] = field(default_factory=dict)

    def calibrate(self, probe: Probe, stage: str, earliest: datetime, rng: random.Random) -> Calibration:
        start, rig = self.bookings.calibration_slot(earliest)
        standard = self._standard_of_the_week(probe.analyte, start.date())
        seen = TRUTH["rig_gain"][rig] * self.true_over_stated(standard)
        read = probe.sensitivity_na_um * seen * math.exp(rng.gauss(0, READING["repeat_sd"]))
        row = _described(probe, stage, start, rng) | {"standard": standard, "rig": rig}
        points = _points(probe, read, rng)
        done = Calibration(row, points, start, standard, probe.sensitivity_na_um, read)
        self.calibrations.append(done)
        return done

    def true_over_stated(self, standard: str) -> float:
        if standard == TRUTH["standard"]["bad"]:
            return float(TRUTH["standard"]["bad_true_over_stated"])
        return math.exp(dice(self.seed, standard).gauss(0, TRUTH["standard"]["true_relative_sd"]))

    def _standard_of_the_week(self, analyte: str, day: date) -> str:
        year, week, _ = day.isocalendar()
        standard = f"S-{year}-{week:02d}-{SHORT[analyte]}"
        prepared_at = at(date.fromisocalendar(year, week, 1), 8)
        good_for = timedelta(days=TRUTH["standard"]["good_for_days"])
        self.standards[standard] = {
            "standard": standard,
            "analyte": analyte,
            "prepared_at": prepared_at,
            "concentration_um": TRUTH["standard"]["stock_um"][analyte],
            "relative_uncertainty": TRUTH["standard"]["stated_relative_uncertainty"],
            "diluent": "0.1 M perchloric acid",
            "expires_at": prepared_at + good_for,
        }
        return standard


def _described(probe: Probe, stage: str, start: datetime, rng: random.Random) -> Row:
    use = TRUTH["use"][probe.waveform]
    shift_v = READING["peak_shift_v_per_log_loss"] * probe.log_loss
    return {
        "electrode": probe.label,
        "at": start,
        "stage": stage,
        "analyte": probe.analyte,
        "waveform": probe.waveform,
        "medium": MEDIUM[probe.analyte],
        "temperature_c": round(rng.uniform(*READING["temperature_c"]), 1),
        "by": rng.choice(TRUTH["people"]["at_the_rig"]),
        "noise_na": round(probe.noise_na * rng.uniform(0.85, 1.15), 3),
        "background_na": round(background_na(probe) * rng.uniform(0.97, 1.03)),
        "oxidation_peak_v": round(use["oxidation_peak_v"] + shift_v + rng.gauss(0, READING["peak_sd_v"]), 3),
        "reduction_peak_v": round(use["reduction_peak_v"] - shift_v + rng.gauss(0, READING["peak_sd_v"]), 3),
    }


def background_na(probe: Probe) -> float:
    """Charging current: capacitance per area × area × scan rate; µF/cm² × µm² × V/s is 1e-5 nA."""
    scan_rate_v_s = next(w["scan_rate_v_s"] for w in TRUTH["waveform"] if w["waveform"] == probe.waveform)
    return float(READING["capacitance_uf_cm2"] * probe.area_um2 * scan_rate_v_s * 1e-5)


def _points(probe: Probe, read_na_um: float, rng: random.Random) -> list[tuple[float, float]]:
    known = TRUTH["use"][probe.waveform]["concentrations_um"]
    chosen = sorted(rng.sample(known, rng.randint(4, len(known))))
    if rng.random() < READING["replicates"]:
        chosen = sorted(chosen + [rng.choice(chosen)] * rng.randint(1, 2))
    intercept_na = rng.gauss(0, READING["intercept_sd_na"])
    return [(stated, _current_na(stated * read_na_um, intercept_na, probe, rng)) for stated in chosen]


def _current_na(signal_na: float, intercept_na: float, probe: Probe, rng: random.Random) -> float:
    injected = signal_na * (1 + rng.gauss(0, READING["injection_sd"]))
    return round(intercept_na + injected + rng.gauss(0, probe.noise_na), 3)


def slope_with_se(points: list[tuple[float, float]]) -> tuple[Cell, Cell]:
    """Slope and standard error, nA/µM, of the line of least squares, as an old notebook would have them."""
    n = len(points)
    mean_x, mean_y = sum(x for x, _ in points) / n, sum(y for _, y in points) / n
    sxx = sum((x - mean_x) ** 2 for x, _ in points)
    slope = sum((x - mean_x) * (y - mean_y) for x, y in points) / sxx
    rest = sum((y - mean_y - slope * (x - mean_x)) ** 2 for x, y in points)
    return round(slope, 3), round(math.sqrt(rest / (n - 2) / sxx), 3)
