"""What a fit sees of the lab: every unit's exposures, renewals and readings as one flat table."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

EXPOSURE, RENEWAL, READING = 0, 1, 2


@dataclass(frozen=True)
class Events:
    """Events of U units in N rows, sorted by unit and, within a unit, by time.

    A unit is one probe seen with one waveform. Per row: `unit` (0..U-1), `kind`, `which` (the index of its
    setting, renewal method or day) and `amount`: hours of an exposure; log(area after / area before) of a
    renewal; y = log(sensitivity, nA/µM) of a reading. `se` is the standard error of y from the calibration's
    own points (NaN: unknown, and NaN in rows that are no reading). Where nothing is known of a unit, its
    group's value is "".
    """

    unit: NDArray[np.int64]
    kind: NDArray[np.int8]
    which: NDArray[np.int64]
    amount: NDArray[np.float64]
    se: NDArray[np.float64]
    units: tuple[str, ...]
    settings: tuple[str, ...]
    renewals: tuple[str, ...]
    days: tuple[str, ...]
    groups: Mapping[str, tuple[str, ...]]
