"""Whose papers lie beside a plain recording."""

from __future__ import annotations

import csv
from pathlib import Path


def labels_in(place: Path) -> tuple[str, ...]:
    """The probes whose papers lie there."""
    found = []
    for path in sorted(place.glob("*/electrode.csv")):
        with path.open(encoding="utf-8", newline="") as file:
            found += [row.get("electrode", "") for row in csv.DictReader(file)]
    return tuple(label for label in found if label)
