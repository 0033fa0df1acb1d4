"""The exchange folder as files: which columns each has, in their order, and how a cell is written."""

from __future__ import annotations

import csv
from collections.abc import Mapping, Sequence
from datetime import date, datetime
from pathlib import Path

Cell = str | float | date | datetime | None
Row = dict[str, Cell]

COLUMNS = {
    "terms": "kind term meaning",
    "analytes": "analyte abbreviation cas molar_mass_g_mol note",
    "waveforms": "waveform vertices_v scan_rate_v_s frequency_hz note",
    "batches": "batch made_on made_by fibre fibre_diameter_um insulation seal backfill note",
    "electrodes": "electrode batch geometry exposed_length_um diameter_um note",
    "inspections": "electrode at exposed_length_um seal_ok background_na noise_na note",
    "coatings": "electrode at material method potential_v duration_s concentration_wt_pct layers "
    "cure_temperature_c cure_min note",
    "conditionings": "electrode at waveform duration_min medium note",
    "cleanings": "electrode at method duration_min note",
    "recuts": "electrode at exposed_length_um note",
    "standards": "standard analyte prepared_at concentration_um relative_uncertainty diluent expires_at note",
    "calibrations": "calibration electrode at stage analyte waveform medium temperature_c standard rig by "
    "noise_na background_na oxidation_peak_v reduction_peak_v sensitivity_na_um sensitivity_se_na_um note",
    "calibration_points": "calibration concentration_um current_na",
    "exposures": "electrode start duration_min setting waveform medium subject recording by note",
    "retirements": "electrode at reason note",
}


def write_folder(folder: Path, tables: Mapping[str, Sequence[Row]]) -> None:
    folder.mkdir(parents=True, exist_ok=True)
    for name, columns in COLUMNS.items():
        _write(folder / f"{name}.csv", columns.split(), tables[name])


def _write(path: Path, columns: list[str], rows: Sequence[Row]) -> None:
    # newline="": the csv module writes RFC 4180's line ends itself, on every system the same.
    with path.open("w", encoding="utf-8", newline="") as file:
        writer = csv.DictWriter(file, columns)
        writer.writeheader()
        writer.writerows({column: _written(cell) for column, cell in row.items()} for row in rows)


def _written(cell: Cell) -> str:
    if cell is None:
        return ""
    if isinstance(cell, date):
        return cell.isoformat()
    return str(int(cell)) if isinstance(cell, float) and cell.is_integer() else str(cell)
