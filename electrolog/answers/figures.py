"""The figures of a calibration: as stored by the present method, or made anew from the raw points."""

from __future__ import annotations

from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass, replace
from typing import Any

from electrolog.answers.answer import Answer
from electrolog.answers.handling import Handling, split, with_handling
from electrolog.errors import DataError
from electrolog.measure.calibrate import CalibrationFigures, calibrate, factor_only
from electrolog.measure.version import METHOD
from electrolog.record import queries, sheets
from electrolog.record.queries import Calibration
from electrolog.record.readable import rows
from electrolog.record.store import Connection, Record

MANY_NEW = 200  # figures that cost more to make again than to keep
KEPT_AT_ONCE = 1000  # of those made again: nobody waits longer than that for a turn to write
NO_CONTENT = "neither points nor a factor were kept: there is nothing to compute from"


@dataclass(frozen=True)
class Recomputed(Answer):
    """A calibration whose figures a new method, or a correction, has changed: figure -> (before, after)."""

    calibration: str
    sensitivity_na_um_before: float | None
    sensitivity_na_um: float | None
    method_before: str | None
    method: str
    changes: dict[str, tuple[Any, Any]]


def figures_of(calibration: Calibration, uncertainties: dict[str, float | None]) -> CalibrationFigures:
    """`uncertainties`: relative standard uncertainty by standard's label."""
    if calibration.figures is not None and _is_kept(calibration):
        return CalibrationFigures.from_dict(calibration.figures)
    return computed(calibration, uncertainties)


def computed(calibration: Calibration, uncertainties: dict[str, float | None]) -> CalibrationFigures:
    row = calibration.row
    shared = uncertainties.get(row["standard"]) if row["standard"] else None
    if calibration.points:
        return _from_points(calibration, shared)
    if row["sensitivity_na_um"] is not None:
        return factor_only(
            row["sensitivity_na_um"],
            row["sensitivity_se_na_um"],
            noise_na=row["noise_na"],
            standard_relative_uncertainty=shared,
        )
    return CalibrationFigures(warnings=(NO_CONTENT,))


def _from_points(calibration: Calibration, shared: float | None) -> CalibrationFigures:
    """As the note's handling says; where a later correction left it impossible, with equal weights, and said."""
    concentrations, currents = zip(*calibration.points, strict=True)
    _, chosen = split(calibration.row["note"])
    said = [chosen.unreadable] if chosen.unreadable else []
    try:
        weights = chosen.weights_of(calibration.points)
    except DataError as why:
        weights = None
        said.append(f"weights by {chosen.weights} can't be had ({why.message}): equal ones were used")
    made = calibrate(
        concentrations,
        currents,
        noise_na=calibration.row["noise_na"],
        standard_relative_uncertainty=shared,
        weights=weights,
        through_zero=chosen.through_zero,
    )
    weighting = None if weights is None else chosen.weights
    return replace(made, weighting=weighting, warnings=(*made.warnings, *said))


def figures_of_points(
    points: Sequence[tuple[float, float]], handling: Handling, noise_na: float | None
) -> CalibrationFigures:
    """Of points that aren't logged yet. Raises DataError where the handling's weights can't be had."""
    handling.weights_of(points)
    note = with_handling(None, Handling(handling.weights, handling.through_zero))
    row = {"standard": None, "sensitivity_na_um": None, "noise_na": noise_na, "note": note}
    return computed(Calibration(row, tuple(points), None), {})


def all_figures(record: Record, calibrations: Iterable[Calibration]) -> dict[int, CalibrationFigures]:
    """Figures by calibration number; where many have none yet, as after an import, they are kept for who asks next."""
    asked = list(calibrations)
    stale = [calibration for calibration in asked if not _is_kept(calibration)]
    with record.reading() as connection:
        uncertainties = standards_uncertainties(connection, stale)
    found = {calibration.row["id"]: figures_of(calibration, uncertainties) for calibration in asked}
    new = [calibration for calibration in asked if calibration.figures is None]
    if len(new) >= MANY_NEW and record.may_keep:
        _keep_unchanged(record, new, found, uncertainties)
    return found


def _keep_unchanged(
    record: Record,
    read: Sequence[Calibration],
    found: Mapping[int, CalibrationFigures],
    uncertainties: dict[str, float | None],
) -> set[int]:
    """Of those that still are as they were read, with figures and their standards' uncertainty; which those were.

    What was corrected meanwhile has figures of its own, or none: these would be of what stood there before.
    """
    with record.writing() as writer:
        standing = standards_uncertainties(writer.connection, read)
        changed = {label for label, value in standing.items() if value != uncertainties.get(label)}
        now = {one.row["id"]: one for one in queries.calibrations_by_id(writer.connection, [o.row["id"] for o in read])}
        same = {o.row["id"] for o in read if now.get(o.row["id"]) == o and o.row["standard"] not in changed}
        queries.keep_figures(writer, {key: (found[key].method, found[key].to_dict()) for key in same})
        return same


def figures_without_points(
    connection: Connection, calibrations: Iterable[Calibration]
) -> dict[int, CalibrationFigures]:
    """Of calibrations read without their points: only those need them whose figures aren't kept."""
    found = {calibration.row["id"]: calibration for calibration in calibrations}
    stale = queries.calibrations_by_id(connection, [key for key, one in found.items() if not _is_kept(one)])
    uncertainties = standards_uncertainties(connection, stale)
    found.update({calibration.row["id"]: calibration for calibration in stale})
    return {key: figures_of(calibration, uncertainties) for key, calibration in found.items()}


def standards_uncertainties(connection: Connection, of: Iterable[Calibration] | None = None) -> dict[str, float | None]:
    """By standard's label: of the standards of these calibrations, or of all."""
    if of is None:
        return {row["standard"]: row["relative_uncertainty"] for row in rows(connection, sheets.STANDARDS)}
    named = queries.standards(connection, [calibration.row["standard"] for calibration in of])
    return {label: row["relative_uncertainty"] for label, row in named.items()}


def _is_kept(calibration: Calibration) -> bool:
    return calibration.figures is not None and calibration.figures.get("method") == METHOD


def recompute(record: Record) -> list[Recomputed]:
    """Makes every calibration's figures again from its raw points, keeps them, and lists what changed."""
    with record.reading() as connection:
        found = queries.calibrations(connection)
        uncertainties = standards_uncertainties(connection)
    changes = []
    for start in range(0, len(found), KEPT_AT_ONCE):
        some = found[start : start + KEPT_AT_ONCE]
        fresh = {calibration.row["id"]: computed(calibration, uncertainties) for calibration in some}
        kept = _keep_unchanged(record, some, fresh, uncertainties)
        changes += [change for one in some if (key := one.row["id"]) in kept for change in _changed(one, fresh[key])]
    return changes


def _changed(calibration: Calibration, made: CalibrationFigures) -> list[Recomputed]:
    kept = calibration.figures
    if kept is None or CalibrationFigures.from_dict(kept) == made:
        return []
    before, after = CalibrationFigures.from_dict(kept).to_dict(), made.to_dict()
    changes = {name: (before[name], after[name]) for name in after if before[name] != after[name]}
    return [
        Recomputed(
            calibration.row["calibration"],
            before["sensitivity_na_um"],
            made.sensitivity_na_um,
            kept.get("method"),
            made.method,
            changes,
        )
    ]
