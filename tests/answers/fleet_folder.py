"""A fleet of known truth written as an exchange folder, so that a question can be asked of a record as a lab would."""

from __future__ import annotations

import csv
import math
from collections.abc import Iterable, Sequence
from datetime import UTC, datetime, timedelta
from pathlib import Path

import numpy as np

from electrolog.fouling.events import EXPOSURE, READING, Events

ANALYTE, WAVEFORM = "dopamine", "triangle"
NOISE_NA = 0.05
LENGTH_UM = 100.0
CONCENTRATIONS_UM = (0.0, 0.25, 0.5, 1.0, 2.0)
_PAUSE = timedelta(minutes=5)

Rows = dict[str, list[dict[str, object]]]


def write_fleet(events: Events, folder: Path, *, points: bool = False) -> datetime:
    """Writes every unit as a probe of its own; returns a moment after the last event.

    The factor goes in as an old record's would, so that the fit sees the fleet's own numbers; with `points`, as five
    points about it.
    """
    tables: Rows = {}
    _add(tables, "terms", kind="cleaning method", term="solvent")
    batches = events.groups["batch"]
    for batch in dict.fromkeys(batches):
        _add(tables, "batches", batch=batch)
    ends = [_write_life(tables, events, unit, points) for unit in range(len(events.units))]
    folder.mkdir(parents=True, exist_ok=True)
    for name, rows in tables.items():
        _write(folder / f"{name}.csv", rows)
    return max(ends) + timedelta(hours=1)


def _add(tables: Rows, table: str, **row: object) -> None:
    tables.setdefault(table, []).append(row)


def _write_life(tables: Rows, events: Events, unit: int, points: bool) -> datetime:
    probe, length = events.units[unit], LENGTH_UM
    _add(tables, "electrodes", electrode=probe, batch=events.groups["batch"][unit], exposed_length_um=length)
    rows = np.flatnonzero(events.unit == unit) if len(events.units) < 1000 else _rows(events, unit)
    now = _first_day(events, rows)
    if events.groups["coating"][unit] not in ("bare", ""):
        _add(tables, "coatings", electrode=probe, at=_iso(now), material=events.groups["coating"][unit])
    for row in rows:
        which, amount = int(events.which[row]), float(events.amount[row])
        if events.kind[row] == READING:
            now = max(now + _PAUSE, _morning(events.days[which]))
            _write_calibration(tables, probe, now, events, int(row), points)
        elif events.kind[row] == EXPOSURE:
            start = now + _PAUSE
            now = start + timedelta(hours=amount)
            setting = events.settings[which]
            _add(tables, "exposures", electrode=probe, start=_iso(start), duration_min=amount * 60, setting=setting)
        else:
            now += _PAUSE
            length *= math.exp(amount)
            _write_renewal(tables, probe, now, events.renewals[which], length)
    return now


def _rows(events: Events, unit: int) -> Iterable[int]:
    return range(*np.searchsorted(events.unit, [unit, unit + 1]).tolist())


def _first_day(events: Events, rows: Iterable[int]) -> datetime:
    dates = [events.days[events.which[row]] for row in rows if events.kind[row] == READING]
    return (_morning(dates[0]) if dates else datetime(2024, 1, 1, tzinfo=UTC)) - timedelta(hours=12)


def _write_calibration(tables: Rows, probe: str, at: datetime, events: Events, row: int, points: bool) -> None:
    label = f"C{len(tables.get('calibrations', [])):06d}"
    sensitivity, se = math.exp(events.amount[row]), float(events.se[row])
    known = {"noise_na": NOISE_NA, "stage": "interim", "analyte": ANALYTE, "waveform": WAVEFORM}
    if points:
        _add(tables, "calibrations", calibration=label, electrode=probe, at=_iso(at), **known)
        bends = np.random.default_rng(row).normal(0, 0.02, len(CONCENTRATIONS_UM))
        for concentration, bend in zip(CONCENTRATIONS_UM, bends, strict=True):
            current = round(sensitivity * concentration * (1 + bend) + bend, 5)
            _add(tables, "calibration_points", calibration=label, concentration_um=concentration, current_na=current)
        return
    error = "" if math.isnan(se) else se * sensitivity
    factor = {"sensitivity_na_um": sensitivity, "sensitivity_se_na_um": error}
    _add(tables, "calibrations", calibration=label, electrode=probe, at=_iso(at), **known, **factor)


def _write_renewal(tables: Rows, probe: str, at: datetime, renewal: str, length: float) -> None:
    if renewal.startswith("clean:"):
        _add(tables, "cleanings", electrode=probe, at=_iso(at), method=renewal.removeprefix("clean:"))
    else:
        _add(tables, "recuts", electrode=probe, at=_iso(at), exposed_length_um=length)


def _morning(day: str) -> datetime:
    """Early, so that a day's runs and its last calibration still fall on the same date."""
    return datetime.fromisoformat(day).replace(hour=1, tzinfo=UTC)


def _iso(moment: datetime) -> str:
    return moment.isoformat()


def _write(path: Path, rows: Sequence[dict[str, object]]) -> None:
    with path.open("w", encoding="utf-8", newline="") as file:
        writer = csv.DictWriter(file, list(rows[0]))
        writer.writeheader()
        writer.writerows(rows)
