"""One probe's life, as the lab logs it: from the making to the last day it is heard of."""

from __future__ import annotations

import math
import random
from collections import defaultdict
from collections.abc import Sequence
from datetime import date, datetime, timedelta

from .bench import MEDIUM, Bench, Calibration, background_na
from .folder import Cell, Row
from .probe import Probe
from .truth import TRUTH, dice, drawn
from .workdays import at, next_workday, workday

LIFE = TRUTH["life"]
Log = defaultdict[str, list[Row]]


class NoMoreToTellError(Exception):
    """The probe is retired, stays on the shelf, or the lab's record ends."""


class Life:
    def __init__(self, probe: Probe, bench: Bench, log: Log) -> None:
        self.probe, self.bench, self.log = probe, bench, log
        self.rng: random.Random = dice(bench.seed, f"{probe.label}/life")
        self.free_at: datetime = at(probe.made_on, 17)
        self.readings: list[Calibration] = []
        self.renewed = False

    def live(self) -> None:
        try:
            self._prepare()
            self._first_calibration()
            for _ in range(self.rng.randint(*LIFE["runs"])):
                self._run()
        except NoMoreToTellError:
            return

    # ── before the first run ──

    def _prepare(self) -> None:
        day = next_workday(self.probe.made_on)
        sealed = self._happens("seal_failed_at_first")
        self._inspect(at(day, 10), seal_ok=not sealed)
        if sealed:
            self._retire(at(day, 10.5), "seal failed", "leaks under the microscope")
        if self.probe.coating != "uncoated":
            self._coat(at(next_workday(day), 14))
        if self._happens("kept_as_spare"):
            raise NoMoreToTellError

    def _coat(self, when: datetime) -> None:
        coat = {name: value for name, value in self._coating().items() if not name.endswith("_factor")}
        self._log("coatings", when, {"material": self.probe.coating, **coat}, minutes=60)

    def _coating(self) -> dict[str, Cell]:
        return dict(TRUTH["coating"][self.probe.coating])

    def _first_calibration(self) -> None:
        days = self.rng.choice(LIFE["days_to_first_calibration"])
        day = workday(self.probe.made_on + timedelta(days=days))
        cycled: Row = {"waveform": self.probe.waveform, "duration_min": 20, "medium": MEDIUM[self.probe.analyte]}
        self._log("conditionings", at(day, 8.5), cycled, minutes=20)
        self._calibrate("pre", at(day, 9))

    # ── a run: calibrate, expose, calibrate ──

    def _run(self) -> None:
        if len(self.readings) > LIFE["most_calibrations"] - 2:
            raise NoMoreToTellError
        gap = timedelta(days=self.rng.randint(*LIFE["days_between_runs"]))
        day = self.bench.bookings.run_day(self.free_at.date() + gap)
        setting = drawn(self.rng, LIFE["setting_share"])
        if self.renewed or self._happens("pre_again"):
            self._calibrate("pre", at(day, 9))
        self._expose_for_run(day, setting)
        self._maybe_break(day)
        self._calibrate_after(day)
        self._look_after()

    def _expose_for_run(self, day: date, setting: str) -> None:
        minutes = 5 * round(self.rng.randint(*LIFE["run_min"][setting]) / 5)
        occasion = f"{self.probe.label}/{day}"
        start = max(at(day, 10.5), self.free_at + timedelta(minutes=15))
        room_for_interim = len(self.readings) <= LIFE["most_calibrations"] - 2
        if setting == "slice" and room_for_interim and self._happens("interim_in_slice"):
            first = 5 * (minutes // 10)
            self._expose(start, first, setting, occasion)
            self._calibrate("interim", self.free_at + timedelta(minutes=15))
            start, minutes = self.free_at + timedelta(minutes=15), minutes - first
        self._expose(start, minutes, setting, occasion)

    def _expose(self, start: datetime, minutes: int, setting: str, occasion: str) -> None:
        medium = {"in-vivo": None, "slice": "aCSF", "flow-cell": MEDIUM[self.probe.analyte]}[setting]
        row: Row = {
            "start": start,
            "duration_min": minutes,
            "setting": setting,
            "waveform": self.probe.waveform,
            "medium": medium,
            "subject": occasion,
            "by": self.rng.choice(TRUTH["people"]["at_the_rig"]),
        }
        self._log("exposures", start, row, minutes=minutes)
        self.probe.expose(minutes / 60, setting)

    def _maybe_break(self, day: date) -> None:
        odds = LIFE["break_base"] * math.exp(LIFE["break_per_log_loss"] * self.probe.log_loss)
        if self.rng.random() >= odds:
            return
        lost = self._happens("lost_of_broken")
        note = "not found after the run" if lost else "broke while being taken out"
        self._retire(self.free_at, "lost" if lost else "broken", note)

    def _calibrate_after(self, day: date) -> None:
        if self._happens("clean_before_post"):
            self._clean("isopropanol", self.free_at + timedelta(minutes=10))
        after = self.free_at + timedelta(minutes=30)
        self._calibrate("post", at(next_workday(day), 9) if self._happens("post_on_next_day") else after)

    def _calibrate(self, stage: str, earliest: datetime) -> None:
        if earliest.date() > TRUTH["ends_on"]:
            raise NoMoreToTellError
        done = self.bench.calibrate(self.probe, stage, max(earliest, self.free_at), self.rng)
        self.free_at = done.at + timedelta(minutes=TRUTH["reading"]["minutes"])
        self.readings.append(done)
        self.renewed = False

    # ── after a run ──

    def _look_after(self) -> None:
        soon = self.free_at + timedelta(minutes=15)
        self._maybe_spoil(soon)
        if self._happens("inspect_after_run"):
            self._inspect(soon)
        share_left = self.readings[-1].read_sensitivity_na_um / self.readings[0].read_sensitivity_na_um
        if share_left < LIFE["worn_below"]:
            self._decide_fate()
        elif share_left < LIFE["tired_below"] and self._happens("tired_cleaned"):
            self._clean(drawn(self.rng, LIFE["cleaning_share"]), self.free_at + timedelta(minutes=15))

    def _maybe_spoil(self, when: datetime) -> None:
        if self._happens("turns_noisy"):
            self._inspect(when, noise_factor=6)
            self._retire(self.free_at, "noisy")
        if self._happens("seal_fails"):
            self._inspect(when, seal_ok=False)
            self._retire(self.free_at, "seal failed")
        if self._happens("tip_bends"):
            self._retire(when, "tip bent")

    def _decide_fate(self) -> None:
        when = self.free_at + timedelta(minutes=15)
        fate = drawn(self.rng, LIFE["worn_fate"])
        if fate == "retire":
            self._retire(when, "fouled")
        elif fate == "re-cut":
            self._recut(when)
        elif fate == "re-coat" and self.probe.coating != "uncoated":
            self._coat(when)
            self._renew("re-coating")
        else:
            self._clean(drawn(self.rng, LIFE["cleaning_share"]), when)

    def _clean(self, method: str, when: datetime) -> None:
        minutes = LIFE["cleaning_min"][method]
        self._log("cleanings", when, {"method": method, "duration_min": minutes}, minutes=minutes)
        self._renew(method)

    def _recut(self, when: datetime) -> None:
        self.probe.exposed_length_um -= self.rng.randint(*LIFE["recut_um"])
        self._log("recuts", when, {"exposed_length_um": self.probe.exposed_length_um}, minutes=15)
        self._renew("re-cut")

    def _renew(self, method: str) -> None:
        self.probe.renew(method)
        self.renewed = True

    def _inspect(self, when: datetime, *, seal_ok: bool = True, noise_factor: float = 1) -> None:
        row: Row = {
            "exposed_length_um": self.probe.exposed_length_um,
            "seal_ok": "yes" if seal_ok else "no",
            "background_na": round(background_na(self.probe) * self.rng.uniform(0.97, 1.03)),
            "noise_na": round(self.probe.noise_na * noise_factor * self.rng.uniform(0.85, 1.15), 3),
        }
        self._log("inspections", when, row, minutes=10)

    def _retire(self, when: datetime, reason: str, note: str | None = None) -> None:
        self._log("retirements", when, {"reason": reason, "note": note}, minutes=0)
        raise NoMoreToTellError

    def _log(self, table: str, when: datetime, row: Row, *, minutes: float) -> None:
        if when.date() > TRUTH["ends_on"]:
            raise NoMoreToTellError
        if when < self.free_at:
            raise RuntimeError(f"{self.probe.label}: {table} at {when}, busy until {self.free_at}")
        stamp = {} if "start" in row else {"at": when}
        self.log[table].append({"electrode": self.probe.label, **stamp, **row})
        self.free_at = when + timedelta(minutes=minutes)

    def _happens(self, chance: str) -> bool:
        return self.rng.random() < float(LIFE[chance])


def live_all(probes: Sequence[Probe], bench: Bench) -> Log:
    log: Log = defaultdict(list)
    for probe in probes:
        Life(probe, bench, log).live()
    return log
