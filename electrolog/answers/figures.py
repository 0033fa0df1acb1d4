"""The figures of a calibration: as stored by the present method, or made anew from the raw points."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass

from electrolog.measure.calibrate import CalibrationFigures, calibrate, factor_only
from electrolog.measure.version import METHOD
from electrolog.record import queries, sheets
from electrolog.record.queries import Calibration
from electrolog.record.readable import rows
from electrolog.record.store import Connection, Record

NO_CONTENT = "neither points nor a factor were kept: there is nothing to compute from"


@dataclass(frozen=True)
class Recomputed:
    """A calibration whose figures a new method, or a correction, has changed."""

    calibration: str
    sensitivity_na_um_before: float | None
    sensitivity_na_um: float | None
    method_before: str | None
    method: str


def figures_of(calibration: Calibration, uncertainties: dict[str, float | None]) -> CalibrationFigures:
    """`uncertainties`: relative standard uncertainty by standard's label."""
    kept = calibration.figures
    if kept is not None and kept.get("method") == METHOD:
        return CalibrationFigures.from_dict(kept)
    return computed(calibration, uncertainties)


def computed(calibration: Calibration, uncertainties: dict[str, float | None]) -> CalibrationFigures:
    row = calibration.row
    shared = uncertainties.get(row["standard"]) if row["standard"] else None
    if calibration.points:
        concentrations, currents = zip(*calibration.points, strict=True)
        return calibrate(concentrations, currents, noise_na=row["noise_na"], standard_relative_uncertainty=shared)
    if row["sensitivity_na_um"] is not None:
        return factor_only(
            row["sensitivity_na_um"],
            row["sensitivity_se_na_um"],
            noise_na=row["noise_na"],
            standard_relative_uncertainty=shared,
        )
    return CalibrationFigures(warnings=(NO_CONTENT,))


def all_figures(record: Record, calibrations: Iterable[Calibration]) -> dict[int, CalibrationFigures]:
    """Figures by calibration number."""
    with record.reading() as connection:
        uncertainties = standards_uncertainties(connection)
    return {calibration.row["id"]: figures_of(calibration, uncertainties) for calibration in calibrations}


def standards_uncertainties(connection: Connection) -> dict[str, float | None]:
    return {row["standard"]: row["relative_uncertainty"] for row in rows(connection, sheets.STANDARDS)}


def recompute(record: Record) -> list[Recomputed]:
    """Makes every calibration's figures again from its raw points, keeps them, and lists what changed."""
    with record.reading() as connection:
        found = queries.calibrations(connection)
        uncertainties = standards_uncertainties(connection)
    fresh = {calibration.row["id"]: computed(calibration, uncertainties) for calibration in found}
    with record.writing() as writer:
        queries.keep_figures(writer, {key: (made.method, made.to_dict()) for key, made in fresh.items()})
    return [change for calibration in found for change in _changed(calibration, fresh[calibration.row["id"]])]


def _changed(calibration: Calibration, made: CalibrationFigures) -> list[Recomputed]:
    kept = calibration.figures
    if kept is None or CalibrationFigures.from_dict(kept) == made:
        return []
    return [
        Recomputed(
            calibration.row["calibration"],
            kept.get("sensitivity_na_um"),
            made.sensitivity_na_um,
            kept.get("method"),
            made.method,
        )
    ]
