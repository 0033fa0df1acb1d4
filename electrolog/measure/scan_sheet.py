"""A sheet of scans (scans, points) read in stretches of rows: it may be larger than the memory there is."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from typing import Any, Protocol

import numpy as np
from numpy.typing import ArrayLike, NDArray

from electrolog.errors import DataError, InputError
from electrolog.measure.recording import MOST_NA, Span, checked_clock, clipped, refuse_too_many, spans_of

Array = NDArray[np.float64]

HELD_POINTS = 5
AROUND = 2  # points to either side that are averaged with the one asked for
_ROWS_AT_ONCE = 512


class ScanSheet(Protocol):
    """(scans, points) in nA: an array, in memory or mapped from a file; it is read in stretches of rows."""

    @property
    def shape(self) -> tuple[int, ...]: ...

    def __getitem__(self, rows: Any, /) -> Any: ...


def clock_of(sheet: ScanSheet, time_s: ArrayLike) -> Array:
    """Times (scans,), where the sheet is one at all."""
    if len(sheet.shape) != 2:
        raise InputError(f"a sheet of scans has two dimensions, scans and points; found {sheet.shape}")
    scans = sheet.shape[0]
    refuse_too_many(scans * sheet.shape[1])
    time = checked_clock(time_s)
    if len(time) != scans:
        raise InputError(f"{scans} scans and {len(time)} times don't pair up; each scan needs one")
    return time


@dataclass(frozen=True)
class Reach:
    """Stretches of `size` rows, with the lowest and highest current in each."""

    size: int
    low: Array  # (stretches,)
    high: Array  # (stretches,)


def first_pass(sheet: ScanSheet, block: int) -> tuple[Array, Reach]:
    """Means over `block` scans (m, points), and how far the current goes. Raises InputError for a NaN, or too much.

    The means are made in the sheet's own precision, in half the time that doubles would take: they say where to look.
    """
    size = max(block, _ROWS_AT_ONCE // block * block)
    means, reach = [], []
    for first, rows in _stretches(sheet, size):
        reach.append(_reach_of(rows, first))
        whole = len(rows) // block * block
        exact = np.result_type(rows.dtype, np.float32)
        means.append(rows[:whole].reshape(-1, block, rows.shape[1]).mean(1, dtype=exact))
    low, high = np.array(reach).T
    if low.min() == high.max():
        raise DataError(f"the current is {low[0]:g} nA throughout: nothing was recorded", "is the probe connected?")
    return np.concatenate(means).astype(np.float64), Reach(size, low, high)


def _reach_of(rows: NDArray[np.floating[Any]], first: int) -> tuple[float, float]:
    low, high = float(rows.min()), float(rows.max())
    if not (low >= -MOST_NA and high <= MOST_NA):
        row, column = (int(i[0]) for i in np.nonzero(~((rows >= -MOST_NA) & (rows <= MOST_NA))))
        raise InputError(
            f"scan {first + row + 1} holds {rows[row, column]:g} nA at its point {column + 1}; accepted: finite numbers"
            f" up to {MOST_NA:g}",
            "leave that scan out of the file: a gap is named and borne",
        )
    return low, high


def column(sheet: ScanSheet, at: int) -> Array:
    first, last = max(0, at - AROUND), at + AROUND + 1
    parts = [rows[:, first:last].mean(1, dtype=np.float64) for _, rows in _stretches(sheet, _ROWS_AT_ONCE)]
    return np.concatenate(parts)


def around(scan: Array, at: int) -> float:
    return float(scan[max(0, at - AROUND) : at + AROUND + 1].mean())


def mean_scan(sheet: ScanSheet, time: Array, span: Span) -> Array:
    rows = np.flatnonzero(span.within(time))
    if len(rows) < 3:
        raise DataError(
            f"{len(rows)} scans lie between {span.start_s:.4g} and {span.end_s:.4g} s, where a plateau or a background "
            "is to be taken; three or more are needed",
            "record longer before and during each injection, or set the stretches by hand",
        )
    return np.asarray(np.asarray(sheet[rows[0] : rows[-1] + 1]).mean(0, dtype=np.float64))


def held_at_limit(sheet: ScanSheet, reach: Reach, time: Array) -> tuple[Span, ...]:
    """Stretches of scans in which the current stands at the sheet's very extreme for several points on end."""
    flags = np.zeros(sheet.shape[0], dtype=bool)
    least, most = float(reach.low.min()), float(reach.high.max())
    for number in np.flatnonzero((reach.low == least) | (reach.high == most)).tolist():
        first = number * reach.size
        rows = np.asarray(sheet[first : first + reach.size])
        at_one = (rows == least) | (rows == most)
        for row in np.flatnonzero(at_one.sum(1) >= HELD_POINTS).tolist():
            scan = rows[row]
            flags[first + row] = bool((clipped(scan) & ((scan == least) | (scan == most))).any())
    return spans_of(flags, time)


def _stretches(sheet: ScanSheet, size: int) -> Iterator[tuple[int, NDArray[np.floating[Any]]]]:
    for first in range(0, sheet.shape[0], size):
        yield first, np.asarray(sheet[first : first + size])
