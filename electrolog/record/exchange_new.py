"""Rows of a file that are new, every one, and plain: taken in at once, without a look at each."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

from electrolog.record import entry, sheets
from electrolog.record.exchange_known import is_labelled

if TYPE_CHECKING:
    from electrolog.record.exchange_merge import SheetMerge

SHARED = (sheets.ANALYTES, sheets.WAVEFORMS, sheets.TERMS)  # names of the trade: another case is the same name


def take_new(merge: SheetMerge, start: int, columns: list[list[Any]]) -> bool:
    """Writes a stretch of rows, given by column, if none needs a second look; says whether it has."""
    if merge.all.faults or merge.all.left_struck or merge.sheet in SHARED or _is_ruled(merge, columns):
        return False
    rows = range(start, start + len(columns[0]))
    keys = list(map(merge.key, zip(*columns, strict=True))) if merge.rows.faulty.isdisjoint(rows) else []
    if not _are_new(merge, keys):
        return False
    points = [merge.all.points.of(key) if merge.sheet is sheets.CALIBRATIONS else [] for key in keys]
    named = dict(zip(merge.names, columns, strict=True))
    ids = entry.insert_all(merge.all.writer, merge.sheet, named, points)
    merge.seen.update(zip(keys, rows, strict=True))
    if is_labelled(merge.sheet):
        merge.all.writer.names.add_all(merge.sheet.name, columns[0], ids)
    merge.counts.added += len(keys)
    if any(points):
        merge.all.counts["calibration_points"].added += sum(map(len, points))
    return True


def _is_ruled(merge: SheetMerge, columns: list[list[Any]]) -> bool:
    """Whether a rule between the columns of a row may speak of one of these."""
    ruled = entry.RULED.get(merge.sheet.name, ())
    named = zip(merge.sheet.columns, columns, strict=True)
    return any(column.name in ruled and values.count(None) < len(values) for column, values in named)


def _are_new(merge: SheetMerge, keys: list[Any]) -> bool:
    """No two alike, and none like one that is known."""
    known = (merge.seen, merge.known.live, merge.known.struck)
    return 0 < len(keys) == len(set(keys)) and all(rows.keys().isdisjoint(keys) for rows in known)
