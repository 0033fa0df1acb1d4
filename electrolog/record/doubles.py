"""One calibration entered twice: the same readings of one probe to the last digit, within a day of each other."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from datetime import datetime, timedelta
from typing import Any

from electrolog.record.queries import Calibration

WITHIN = timedelta(hours=24)  # noise gives no probe the same points twice; a copy is made on the same day
ENOUGH = 2  # one point, as of a blank, may well come again


@dataclass(frozen=True)
class Readings:
    """What a calibration says, its probe, analyte and waveform aside: points (µM, nA), or the factor alone (nA/µM)."""

    at: datetime
    stage: str
    points: tuple[tuple[float, float], ...]
    factor_na_um: float | None = None

    @property
    def said(self) -> str:
        return f"the same {len(self.points)} points" if self.points else "the same factor"


def readings_of(one: Calibration) -> Readings:
    return Readings(one.at, one.row["stage"], one.points, one.row["sensitivity_na_um"])


def is_double(one: Readings, other: Readings) -> bool:
    """A factor has few digits, so that it must be of the same stage too."""
    if abs(one.at - other.at) >= WITHIN:
        return False
    if one.points or other.points:
        return len(one.points) >= ENOUGH and sorted(one.points) == sorted(other.points)
    return one.factor_na_um is not None and (one.factor_na_um, one.stage) == (other.factor_na_um, other.stage)


def first_double(new: Readings, earlier: Sequence[tuple[Readings, Any]]) -> Any | None:
    """What stands beside the first of `earlier` that says the same."""
    return next((beside for old, beside in earlier if is_double(new, old)), None)
