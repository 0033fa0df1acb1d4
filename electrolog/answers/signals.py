"""From a recording to the points of a calibration, with all that was found and every choice that led there."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import asdict, dataclass, replace
from pathlib import Path
from typing import Any

import numpy as np
from numpy.typing import NDArray

from electrolog.answers import signal_files as files
from electrolog.answers.answer import Answer
from electrolog.answers.history import usual_waveform
from electrolog.errors import InputError, UnknownName
from electrolog.measure.peaks import Peak
from electrolog.measure.recording import NEGATIVE, Span
from electrolog.measure.scan_sheet import ScanSheet
from electrolog.measure.scans import ScanReading, ScanSettings, Voltammogram, read_scans
from electrolog.measure.sweep import potentials_v
from electrolog.measure.trace import Plateau, TraceReading, TraceSettings, read_trace
from electrolog.record import sheets
from electrolog.record.names import Names
from electrolog.record.readable import row_by_id
from electrolog.record.store import Record

Array = NDArray[np.float64]
Points = tuple[tuple[float, float], ...]
SAME_SWEEP_V = 0.05  # common practice: sampling misses a vertex by less than this


@dataclass(frozen=True)
class Recorded(Answer):
    """`points`: without the injections left out. `columns`: what it says of the calibration beside them.

    `account`: the file, the settings and everything found, as plain values to be kept with the calibration.
    """

    points: Points
    columns: dict[str, float]
    account: dict[str, Any]
    warnings: tuple[str, ...]
    doubts: tuple[str, ...]
    reading: TraceReading | ScanReading
    concentration_um: tuple[float, ...]
    sheet: ScanSheet | None = None


@dataclass(frozen=True)
class Sweep:
    """The waveform's, where the file doesn't say its potentials or times."""

    vertices_v: tuple[float, ...]
    frequency_hz: float


def from_trace(
    path: Path,
    concentration_um: Sequence[float],
    settings: TraceSettings,
    *,
    rate_hz: float | None = None,
    left_out: Sequence[int] = (),
) -> Recorded:
    """A flow-cell recording at one potential. Raises InputError, DataError."""
    reading = read_trace(*files.trace_from(path, rate_hz), settings)
    found = [_of_plateau(one) for one in reading.plateaus]
    return _recorded("trace", path, reading, {"noise_na": reading.noise_na}, concentration_um, found, left_out)


def from_scans(
    path: Path,
    concentration_um: Sequence[float],
    settings: ScanSettings,
    *,
    sweep: Sweep | None = None,
    left_out: Sequence[int] = (),
) -> Recorded:
    """A sheet of scans. `sweep` is needed where the file doesn't say its potentials and times."""
    file = files.scans_from(path)
    potential, time = file.potential_v, file.time_s
    if sweep is not None:
        potential = potentials_v(sweep.vertices_v, file.sheet.shape[1]) if potential is None else potential
        time = np.arange(file.sheet.shape[0]) / sweep.frequency_hz if time is None else time
    if potential is None or time is None:
        raise InputError(
            f"{path.name}: doesn't say its potentials and times", "name the waveform (-w): they follow from it"
        )
    reading = read_scans(file.sheet, potential, time, settings)
    peaks = reading.peaks
    columns = {"noise_na": reading.noise_na, "background_na": reading.charging_na}
    columns |= {"oxidation_peak_v": peaks.oxidation.potential_v} if peaks.oxidation else {}
    columns |= {"reduction_peak_v": peaks.reduction.potential_v} if peaks.reduction else {}
    found = [_of_voltammogram(one) for one in reading.voltammograms]
    taken = {"taken_at_v": reading.trace_v, "background_at_v": reading.charging_v}
    recorded = _recorded("scans", path, reading, columns, concentration_um, found, left_out, taken, file.sheet)
    said = _other_sweep(potential, sweep) if sweep is not None and file.potential_v is not None else ()
    return replace(recorded, warnings=(*recorded.warnings, *said), doubts=(*recorded.doubts, *said))


def _other_sweep(potential_v: Array, sweep: Sweep) -> tuple[str, ...]:
    """The waveform decides with which calibrations this one is compared: it must be the one recorded."""
    found_v = float(np.min(potential_v)), float(np.max(potential_v))
    named_v = min(sweep.vertices_v), max(sweep.vertices_v)
    if max(abs(found - named) for found, named in zip(found_v, named_v, strict=True)) <= SAME_SWEEP_V:
        return ()
    return (
        f"the file's potentials run from {found_v[0]:.3g} to {found_v[1]:.3g} V, the waveform's from {named_v[0]:g} to "
        f"{named_v[1]:g} V: is it the right waveform?",
    )


def sweep_of(record: Record, label: str, analyte: str, waveform: str | None) -> Sweep | None:
    """Of the named waveform, or of the probe's usual one; None where it has none yet. Raises UnknownName."""
    named = waveform
    if named is None:
        try:
            named = usual_waveform(record, label, analyte)
        except UnknownName:
            raise
        except InputError:
            return None
    with record.reading() as connection:
        row = row_by_id(connection, sheets.WAVEFORMS, Names(connection).row_id("waveforms", named))
    return Sweep(tuple(float(part) for part in row["vertices_v"].split()), row["frequency_hz"])


def injections_given(path: Path) -> tuple[tuple[Span, ...], tuple[float, ...] | None]:
    """A table's injections, and their concentrations (µM) where it has them."""
    rows = files.injections_from(path)
    spans = tuple(Span(row["start_s"], row["end_s"]) for row in rows)
    concentrations = [row.get("concentration_um") for row in rows]
    known = tuple(value for value in concentrations if value is not None and np.isfinite(value))
    if known and len(known) != len(rows):
        raise InputError(f"{path.name}: some injections have a concentration_um and some don't; accepted: all or none")
    return spans, known or None


def _recorded(
    kind: str,
    path: Path,
    reading: TraceReading | ScanReading,
    columns: dict[str, float],
    concentration_um: Sequence[float],
    found: Sequence[dict[str, Any]],
    left_out: Sequence[int],
    taken: Mapping[str, float] | None = None,
    sheet: ScanSheet | None = None,
) -> Recorded:
    points = reading.points(concentration_um)
    _refuse_left_out(left_out, len(points))
    kept = tuple(point for place, point in enumerate(points, 1) if place not in left_out)
    account = {
        "from": kind,
        "file": path.name,
        "sha256": files.fingerprint(path),
        "settings": _settings(reading.settings),
        **(taken or {}),
        "noise_na": reading.noise_na,
        "injections": [{"concentration_um": c, **one} for (c, _), one in zip(points, found, strict=True)],
        "left_out": sorted(set(left_out)),
        "warnings": list(reading.warnings),
    }
    plain: dict[str, Any] = _plain(account)
    return Recorded(
        points=kept,
        columns={name: _plain(value) for name, value in columns.items()},
        account=plain,
        warnings=reading.warnings,
        doubts=_doubts(kept),
        reading=reading,
        concentration_um=tuple(concentration_um),
        sheet=sheet,
    )


def _doubts(points: Points) -> tuple[str, ...]:
    if not points or not all(current < 0 for _, current in points):
        return ()
    return (f"the current falls at every injection: {NEGATIVE} --negative turns the recording",)


def _refuse_left_out(left_out: Sequence[int], injections: int) -> None:
    wrong = [place for place in left_out if not 1 <= place <= injections]
    if wrong:
        raise InputError(f"leave out: there is no injection {wrong[0]}; accepted: 1 to {injections}")
    if len(set(left_out)) == injections:
        raise InputError("leave out: every injection is left out; accepted: all but one at most")


def _of_plateau(one: Plateau) -> dict[str, Any]:
    return {
        **_times(one.injection, one.window),
        "level_na": one.level_na,
        "noise_na": one.noise_na,
        "rise_s": one.rise_s,
        "fall_s": one.fall_s,
        "tailing": one.tailing,
    }


def _of_voltammogram(one: Voltammogram) -> dict[str, Any]:
    return {
        **_times(one.injection, one.window),
        "level_na": one.level_na,
        "oxidation": _of_peak(one.peaks.oxidation),
        "reduction": _of_peak(one.peaks.reduction),
        "separation_v": one.peaks.separation_v,
    }


def _times(injection: Span, window: Span) -> dict[str, float]:
    return {
        "start_s": injection.start_s,
        "end_s": injection.end_s,
        "plateau_from_s": window.start_s,
        "plateau_to_s": window.end_s,
    }


def _of_peak(peak: Peak | None) -> dict[str, Any] | None:
    if peak is None:
        return None
    return {
        "potential_v": peak.potential_v,
        "current_na": peak.current_na,
        "width_v": peak.width_v,
        "by_hand": peak.by_hand,
    }


def _settings(settings: TraceSettings | ScanSettings) -> dict[str, Any]:
    """Flat, without what only says "as found"."""
    said = asdict(settings)
    flat = {**said.pop("trace", {}), **said}
    given = flat.pop("injections", None) is not None
    return {name: value for name, value in flat.items() if value is not None} | {"injections_given": given}


def _plain(value: Any) -> Any:
    """Plain values; seven digits are more than any recording has."""
    if isinstance(value, Mapping):
        return {str(name): _plain(item) for name, item in value.items()}
    if isinstance(value, list | tuple):
        return [_plain(item) for item in value]
    return float(f"{value:.7g}") if isinstance(value, float) else value
