"""Decisions on a fleet of known truth, asked of a record as a lab would ask, beside the truth and the oracle.

python -m tests.answers.decisions FAMILY... prints the table.
"""

from __future__ import annotations

import sys
import tempfile
from dataclasses import dataclass
from pathlib import Path

import numpy as np

from electrolog.answers.asked import Run
from electrolog.fouling.events import READING
from electrolog.lab import open_lab
from tests.answers.fleet_folder import ANALYTE, NOISE_NA, WAVEFORM, write_fleet
from tests.fouling.fleets.oracle import oracle
from tests.fouling.fleets.simulate import AHEAD_H, Fleet, State, _log_sensitivity, fleet, last_rows, walk

RISK = 0.05
GOOD_SHARE = 0.65  # of the probes still reach the detection limit after the run
A_YEAR = "8760h"
LONGEST_MIN = 72 * 60


@dataclass(frozen=True)
class Decisions:
    """Over the probes that can be scored and whose calibration stands; minutes are of run from now."""

    fit: np.ndarray
    retired: np.ndarray
    oracle: np.ndarray
    broken_now: np.ndarray
    broken_at_end: np.ndarray
    longest_min: np.ndarray  # NaN where it can't be told
    true_longest_min: np.ndarray

    @property
    def fit_that_break(self) -> float:
        return float(self.broken_at_end[self.fit].mean())

    @property
    def good_called_fit(self) -> float:
        """Of the truly good, how many are called fit for each that the oracle calls fit."""
        good = ~self.broken_at_end
        return float((self.fit & good).sum() / (self.oracle & good).sum())

    @property
    def promised_that_break(self) -> tuple[int, int]:
        """Of how many promised runs, none and the longest of all left out, how many break before their end."""
        told = (self.longest_min > 0) & (self.longest_min < LONGEST_MIN)
        return int((self.true_longest_min[told] < self.longest_min[told]).sum()), int(told.sum())

    @property
    def longest_that_break(self) -> float:
        broken, promised = self.promised_that_break
        return broken / promised

    @property
    def longest_of_true(self) -> float:
        """The median share of the truly longest run that is promised."""
        told = (self.longest_min > 0) & (self.longest_min < LONGEST_MIN)
        return float(np.median(self.longest_min[told] / self.true_longest_min[told]))


def decided(family: str, seed: int, n_units: int, folder: Path) -> Decisions:
    known = fleet(family, seed, n_units)
    truth, scored = known.truth, known.truth.scored
    least = float(np.quantile(truth.log_sensitivity_ahead[scored], 1 - GOOD_SHARE))
    lab = open_lab(str(folder / "lab.db"), create=True)
    moment = write_fleet(known.events, folder / "exchange")
    lab.import_folder(folder / "exchange")
    needs_um = float(3 * NOISE_NA / np.exp(least))
    limits = {"oldest-calibration": A_YEAR, "accepted-risk": f"{RISK}"}
    run = Run(ANALYTE, WAVEFORM, "in-vivo", AHEAD_H * 60)
    found = lab.check(list(known.events.units), run, needs_um=needs_um, limits=limits, moment=moment)
    verdicts = {one.electrode: one.verdict for one in found}
    words = np.array([verdicts[label].verdict for label in known.events.units])
    longest = [verdicts[label].longest_run_min for label in known.events.units]
    asked = scored & _stands(known)
    best = oracle(known, 500)
    p_best = np.where(best.ahead < least, best.weights, 0.0).sum(axis=1)
    return Decisions(
        (words == "fit")[asked],
        (words == "retire")[asked],
        (p_best <= RISK)[asked],
        (truth.log_sensitivity_now < least)[asked],
        (truth.log_sensitivity_ahead < least)[asked],
        np.array([np.nan if minutes is None else minutes for minutes in longest])[asked],
        _true_longest_min(known, least)[asked],
    )


def _stands(known: Fleet) -> np.ndarray:
    """Nothing has happened to the probe since its last calibration."""
    return np.asarray(known.events.kind[last_rows(known.events)] == READING)


def _true_longest_min(known: Fleet, least: float) -> np.ndarray:
    gen, units, events = known.truth.generator, known.truth.units, known.events
    state, last = walk(gen, events), last_rows(events)
    every = np.arange(len(events.units))
    low, high = np.zeros(len(every)), np.full(len(every), float(LONGEST_MIN))
    for _ in range(20):
        middle = (low + high) / 2
        ahead = State(state.clock_h[last] + middle / 60, state.log_area[last], np.maximum(state.runs[last], 1))
        holds = _log_sensitivity(gen, units, every, ahead) >= least
        low, high = np.where(holds, middle, low), np.where(holds, high, middle)
    return low


def joined(parts: list[Decisions]) -> Decisions:
    names = Decisions.__dataclass_fields__
    return Decisions(*(np.concatenate([getattr(part, name) for part in parts]) for name in names))


def row(name: str, one: Decisions) -> str:
    return (
        f"{name:18} {len(one.fit):6} {one.fit.sum():5} {one.fit_that_break:10.1%} {one.good_called_fit:12.1%} "
        f"{one.retired.sum():8} {one.broken_now[one.retired].mean() if one.retired.any() else float('nan'):8.1%} "
        f"{one.longest_that_break:12.1%} {one.longest_of_true:8.2f}"
    )


def main(families: list[str]) -> None:
    print("family             probes   fit fit-broken good/oracle's  retired  broken longest-broke of true")
    every = []
    for family in families:
        with tempfile.TemporaryDirectory() as folder:
            every.append(decided(family, 0, 200, Path(folder)))
        print(row(family, every[-1]), flush=True)
    print(row("all", joined(every)))


if __name__ == "__main__":
    main(sys.argv[1:])
