"""The whole lab: every life lived, then put in order, labelled and written down as the lab would have it."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Sequence
from dataclasses import dataclass
from datetime import datetime
from itertools import count

from .bench import Bench, Calibration, slope_with_se
from .folder import COLUMNS, Row
from .life import live_all
from .probe import Probe, made_probes
from .truth import TRUTH

SLIPS = TRUTH["slips"]


@dataclass(frozen=True)
class Lab:
    tables: dict[str, list[Row]]
    calibrations: dict[str, Calibration]  # by label; they know the truth behind each reading
    probes: dict[str, Probe]  # by label, as they truly are at the record's end


def invented_lab(seed: int) -> Lab:
    probes = list(made_probes(seed))
    made_lengths_um = {probe.label: probe.exposed_length_um for probe in probes}
    bench = Bench(seed)
    log = live_all(probes, bench)
    calibrations = _labelled(bench.calibrations)
    tables: dict[str, list[Row]] = defaultdict(list, {name: _in_order(rows) for name, rows in log.items()})
    tables |= _words() | {
        "electrodes": [_electrode(probe, made_lengths_um[probe.label]) for probe in probes],
        "standards": [bench.standards[label] for label in sorted(bench.standards)],
        "exposures": _numbered(_in_order(log["exposures"])),
        "calibrations": [_calibration(label, done) for label, done in calibrations.items()],
        "calibration_points": [row for label, done in calibrations.items() for row in _points(label, done)],
    }
    return Lab(tables, calibrations, {probe.label: probe for probe in probes})


def _words() -> dict[str, list[Row]]:
    batches = [
        {name: cell for name, cell in row.items() if name in COLUMNS["batches"].split()} for row in TRUTH["batch"]
    ]
    return {
        "terms": TRUTH["term"],
        "analytes": TRUTH["analyte"],
        "waveforms": TRUTH["waveform"],
        "batches": batches,
    }


def _electrode(probe: Probe, exposed_length_um: float) -> Row:
    return {
        "electrode": probe.label,
        "batch": probe.batch,
        "geometry": "cylinder",
        "exposed_length_um": exposed_length_um,
        "diameter_um": probe.diameter_um,
    }


def _in_order(rows: Sequence[Row]) -> list[Row]:
    return sorted(rows, key=_when_and_whose)


def _when_and_whose(row: Row) -> tuple[datetime, str]:
    when = row.get("at") or row["start"]
    if not isinstance(when, datetime):
        raise TypeError(f"no time in {row}")
    return when, str(row["electrode"])


def _labelled(calibrations: Sequence[Calibration]) -> dict[str, Calibration]:
    in_order = sorted(calibrations, key=lambda done: (done.at, str(done.row["electrode"])))
    return {f"C{number:04d}": done for number, done in enumerate(in_order, start=1)}


def _numbered(exposures: Sequence[Row]) -> list[Row]:
    """Recordings and subjects are numbered as they come; the parts of one run share a subject."""
    prefixes = {"in-vivo": ("animal", count(1)), "slice": ("slice", count(1))}
    subjects: dict[object, str | None] = {}
    numbered = []
    for number, row in enumerate(exposures, start=1):
        occasion = row["subject"]
        if occasion not in subjects:
            prefix, numbers = prefixes.get(str(row["setting"]), (None, count()))
            subjects[occasion] = f"{prefix}-{next(numbers):03d}" if prefix else None
        numbered.append(row | {"subject": subjects[occasion], "recording": f"R{number:04d}"})
    return numbered


def _calibration(label: str, done: Calibration) -> Row:
    row: Row = {"calibration": label, **done.row}
    if label in SLIPS["factor_only"]:
        slope, se = slope_with_se(done.points)
        row |= {"sensitivity_na_um": slope, "sensitivity_se_na_um": se}
        row["note"] = "factor copied from the notebook; the points were not kept"
    return row


def _points(label: str, done: Calibration) -> list[Row]:
    if label in SLIPS["factor_only"]:
        return []
    factor = 1000 if label == SLIPS["nanomolar_as_micromolar"] else 1
    return [{"calibration": label, "concentration_um": c * factor, "current_na": i} for c, i in done.points]
