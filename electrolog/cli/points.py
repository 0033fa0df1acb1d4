"""Calibration points as typed, `0.5uM:5.1,5.3`, or from a CSV file."""

from __future__ import annotations

import csv
from collections.abc import Iterable
from pathlib import Path

from electrolog.errors import FaultyRows, InputError, shortened
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
        at_um = parse_quantity(concentration, CONCENTRATION_UM, "concentration")
        if at_um < 0:
            raise InputError(f"concentration: '{shortened(pair)}' lies below zero; accepted: zero or more")
        points += [(at_um, parse_quantity(text, CURRENT_NA, "current")) for text in currents.split(",")]
    return points


def from_file(path: Path) -> dict[str, list[Point]]:
    """Points by probe, from the columns concentration_um, current_na and (for several probes) electrode."""
    by_probe: dict[str, list[Point]] = {}
    faults: list[str] = []
    with path.open(encoding="utf-8-sig", newline="") as file:
        reader = csv.DictReader(file)
        missing = [name for name in _COLUMNS if name not in (reader.fieldnames or ())]
        if missing:
            raise InputError(
                f"{path.name}: has no column {' or '.join(missing)};"
                " accepted: concentration_um, current_na and, for several probes, electrode"
            )
        for row in reader:
            try:
                points = parsed([f"{row['concentration_um']}:{row['current_na']}"])
                by_probe.setdefault(row.get("electrode") or "", []).extend(points)
            except InputError as fault:
                faults.append(f"{path.name} line {reader.line_num}: {fault.message}")
    if faults:
        raise FaultyRows(f"{path.name}: {len(faults)} rows can't be taken; nothing was written", faults)
    if not by_probe:
        raise InputError(f"{path.name}: holds no points; accepted: a row per point")
    return by_probe
