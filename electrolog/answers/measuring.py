"""The measuring part of the one door: calibrations, their figures, standards, and what a current stands for."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from datetime import tzinfo
from pathlib import Path
from typing import TYPE_CHECKING

from electrolog.record.columns import Value
from electrolog.record.store import Record

if TYPE_CHECKING:
    from electrolog.answers.calibrating import NewCalibration
    from electrolog.answers.controlling import Controlled, Wanted
    from electrolog.answers.detecting import Routes
    from electrolog.answers.entering import Entered
    from electrolog.answers.figures import Recomputed
    from electrolog.answers.handling import Handling
    from electrolog.answers.history import Reading
    from electrolog.answers.preparing import Preparation, PreparedStandard
    from electrolog.answers.quantities import Quantity
    from electrolog.answers.reading_off import ReadOff
    from electrolog.answers.signals import Recorded, Sweep
    from electrolog.measure.calibrate import CalibrationFigures
    from electrolog.measure.dilution_plan import DilutionPlan
    from electrolog.measure.scans import ScanSettings
    from electrolog.measure.trace import TraceSettings


@dataclass(frozen=True)
class Measuring:
    """A record and the time zone in which times without an offset are read (None: the machine's)."""

    record: Record
    zone: tzinfo | None = None

    def calibrate(self, new: Sequence[NewCalibration], *, confirmed: bool = False) -> list[Entered]:
        """Logs calibrations with their raw points and keeps what was computed from them."""
        from electrolog.answers.calibrating import log_calibrations

        return log_calibrations(self.record, new, self.zone, confirmed)

    def read_trace(
        self,
        file: Path,
        concentration_um: Sequence[float],
        settings: TraceSettings | None = None,
        *,
        rate_hz: float | None = None,
        left_out: Sequence[int] = (),
    ) -> Recorded:
        """What a flow-cell recording shows; nothing is logged. `concentration_um`: of each injection in order."""
        from electrolog.answers.signals import from_trace
        from electrolog.measure.trace import TraceSettings

        return from_trace(file, concentration_um, settings or TraceSettings(), rate_hz=rate_hz, left_out=left_out)

    def read_scans(
        self,
        file: Path,
        concentration_um: Sequence[float],
        settings: ScanSettings | None = None,
        *,
        sweep: Sweep | None = None,
        left_out: Sequence[int] = (),
    ) -> Recorded:
        """What a sheet of scans shows; nothing is logged. `sweep`: where the file doesn't say its own."""
        from electrolog.answers.signals import from_scans
        from electrolog.measure.scans import ScanSettings

        return from_scans(file, concentration_um, settings or ScanSettings(), sweep=sweep, left_out=left_out)

    def log_recorded(
        self,
        recorded: Recorded,
        values: Mapping[str, str | Value | None],
        handling: Handling | None = None,
        *,
        confirmed: bool = False,
    ) -> Entered:
        """Logs what was read as a calibration; `values`: its probe, stage, analyte and the rest as they are typed.

        Raises DoubtfulEntry for a likely slip unless confirmed.
        """
        from electrolog.answers.handling import Handling
        from electrolog.answers.recorded import log_recorded

        return log_recorded(self.record, recorded, values, handling or Handling(), self.zone, confirmed)

    def figures_of_points(
        self, points: Sequence[tuple[float, float]], handling: Handling, noise_na: float | None = None
    ) -> CalibrationFigures:
        """What points would say as a calibration; nothing is logged. Raises DataError where weights can't be had."""
        from electrolog.answers.figures import figures_of_points

        return figures_of_points(points, handling, noise_na)

    def readings(
        self,
        labels: Sequence[str],
        *,
        analyte: str | None = None,
        waveform: str | None = None,
        expected_um: tuple[float, float] | None = None,
    ) -> list[Reading]:
        """The sensitivity history of the named probes, oldest first."""
        from electrolog.answers.history import readings

        return readings(self.record, labels, analyte, waveform, expected_um)

    def readings_of(self, calibrations: Sequence[str]) -> list[Reading]:
        """Calibrations by their own labels."""
        from electrolog.answers.history import readings_of

        return readings_of(self.record, calibrations)

    def detection(self, reading: Reading) -> Routes:
        """Detection limits of one calibration by every recognised route."""
        from electrolog.answers.detecting import routes

        return routes(reading)

    def usual_waveform(self, label: str, analyte: str) -> str:
        """The waveform this probe was last calibrated with for the analyte. Raises InputError if it never was."""
        from electrolog.answers.history import usual_waveform

        return usual_waveform(self.record, label, analyte)

    def sweep(self, label: str, analyte: str, waveform: str | None = None) -> Sweep | None:
        """The potentials and the rate of a waveform, or of the one the probe is usually calibrated with."""
        from electrolog.answers.signals import sweep_of

        return sweep_of(self.record, label, analyte, waveform)

    def read_off(self, calibration: str, current_na: Sequence[float], confidence: float = 0.95) -> ReadOff:
        """The concentration that replicate currents stand for, by one calibration."""
        from electrolog.answers.reading_off import read_off

        return read_off(self.record, calibration, current_na, confidence)

    def prepare_standard(
        self, values: Mapping[str, str], preparation: Preparation | None = None, *, usual_expiry: bool = False
    ) -> PreparedStandard:
        """Logs a standard, its concentration typed or computed from the balance and the flasks."""
        from electrolog.answers.preparing import log_standard

        return log_standard(self.record, values, preparation, usual_expiry, self.zone)

    def plan_dilutions(
        self, stock: str, wanted_um: Sequence[float], volume_ml: float, smallest_ml: float
    ) -> DilutionPlan:
        """Volumes from a stock: a concentration as typed, or a standard's label."""
        from electrolog.answers.preparing import plan

        return plan(self.record, stock, wanted_um, volume_ml, smallest_ml)

    def control(self, labels: Sequence[str], quantity: Quantity, wanted: Wanted) -> list[Controlled]:
        """Control charts of a check probe, or of a check standard over several, a chart per rig."""
        from electrolog.answers.controlling import control

        return control(self.record, labels, quantity, wanted)

    def recompute(self) -> list[Recomputed]:
        """Makes all figures again from the raw points; returns what changed."""
        from electrolog.answers.figures import recompute

        return recompute(self.record)
