"""Calibration points as typed, `0.5uM:5.1,5.3`, or from a CSV file."""

from __future__ import annotations

import csv
import io
from collections.abc import Iterable, Iterator
from pathlib import Path

from electrolog.errors import FaultyRows, InputError, shortened
from electrolog.record.sheets import POINT_NA, POINT_UM
from electrolog.texts import small_text
from electrolog.units import CONCENTRATION_UM, CURRENT_NA, parse_quantity

Point = tuple[float, float]
_COLUMNS = ("concentration_um", "current_na")


def parsed(pairs: Iterable[str]) -> list[Point]:
    """`CONCENTRATION:CURRENT[,CURRENT…]` each: replicates share their concentration. Raises InputError."""
    points: list[Point] = []
    for pair in pairs:
        concentration, colon, currents = pair.partition(":")
        if not colon or not currents.strip():
            raise InputError(
                f"point: '{shortened(pair)}' is no pair; accepted: concentration:current with replicates after"
                " commas, such as 0.5uM:5.1,5.3"
            )
        points += [_point(concentration, current) for current in currents.split(",")]
    return points


def _point(concentration: str, current: str) -> Point:
    at_um = parse_quantity(concentration, CONCENTRATION_UM, "concentration")
    current_na = parse_quantity(current, CURRENT_NA, "current")
    return POINT_UM.checked(at_um, concentration), POINT_NA.checked(current_na, current)


def from_file(path: Path) -> dict[str, list[Point]]:
    """Points by probe, from the columns concentration_um, current_na and (for several probes) electrode."""
    by_probe: dict[str, list[Point]] = {}
    faults: list[str] = []
    for line, row in _rows(path):
        try:
            if None in row or None in row.values():
                raise InputError(f"has not one cell for each of the {len([key for key in row if key])} columns")
            by_probe.setdefault(row.get("electrode") or "", []).append(_point(row[_COLUMNS[0]], row[_COLUMNS[1]]))
        except InputError as fault:
            faults.append(f"{path.name} line {line}: {fault.message}")
    if faults:
        raise FaultyRows(f"{path.name}: {len(faults)} rows can't be taken; nothing was written", faults)
    if not by_probe:
        raise InputError(f"{path.name}: holds no points; accepted: a row per point")
    return by_probe


def _rows(path: Path) -> Iterator[tuple[int, dict[str, str]]]:
    reader = csv.DictReader(io.StringIO(small_text(path, "CSV in UTF-8"), newline=""), strict=True)
    try:
        missing = [name for name in _COLUMNS if name not in (reader.fieldnames or ())]
        if missing:
            raise InputError(
                f"{path.name}: has no column {' or '.join(missing)};"
                " accepted: concentration_um, current_na and, for several probes, electrode"
            )
        for row in reader:
            yield reader.line_num, row
    except csv.Error as why:
        raise InputError(f"{path.name} line {reader.line_num}: can't be read ({why}); accepted: CSV") from None
