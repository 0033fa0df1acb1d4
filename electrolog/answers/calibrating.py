"""Logging calibrations: figures are computed from the points, looked over for slips, and kept beside the row."""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass
from datetime import tzinfo
from itertools import count
from typing import Any

from electrolog.answers import figures as made
from electrolog.answers.entering import Entered, Typed, confirm, doubts_of, entered, read
from electrolog.answers.handling import split
from electrolog.answers.labels import known_labels
from electrolog.clock import shown_moment
from electrolog.errors import InputError, shortened
from electrolog.measure.calibrate import CalibrationFigures
from electrolog.measure.health import other_standard
from electrolog.measure.slips import likely_slips
from electrolog.record import entry, queries, sheets
from electrolog.record.columns import Value
from electrolog.record.doubles import Readings, first_double, readings_of
from electrolog.record.journal import Writer
from electrolog.record.readable import row_by_id
from electrolog.record.store import Record

Points = Sequence[tuple[float, float]]


@dataclass(frozen=True)
class NewCalibration:
    """One calibration about to be logged: its columns as typed, its raw points (µM, nA)."""

    values: Typed
    points: Points = ()


def log_calibrations(
    record: Record, new: Sequence[NewCalibration], zone: tzinfo | None, confirmed: bool
) -> list[Entered]:
    """Calibrations with their points and figures; a label that isn't given is the next free number."""
    with record.writing() as writer:
        labels = _labels(writer, new)
        rows = [
            (_labelled(writer, one.values, label, zone), _checked(one.points))
            for one, label in zip(new, labels, strict=True)
        ]
        uncertainties = made.standards_uncertainties(writer.connection)
        for row, points in rows:
            _, handling = split(row.get("note"))  # type: ignore[arg-type]
            handling.weights_of(points)  # asked for and not to be had: said before anything is written
        computed = [made.computed(_as_calibration(row, points), uncertainties) for row, points in rows]
        said = doubts_of(writer, sheets.CALIBRATIONS, [row for row, _ in rows])
        for (row, points), figures in zip(rows, computed, strict=True):
            earlier = _earlier(writer, row)
            said += _entered_twice(row, points, earlier)
            said += _slips(row, points, figures, _figured(earlier)) + _of_the_standard(writer, row)
        confirm(said, confirmed)
        logged = [
            entered(writer, sheets.CALIBRATIONS, entry.add(writer, sheets.CALIBRATIONS, row, points), said)
            for row, points in rows
        ]
        queries.keep_figures(
            writer,
            {one.row_id: (figures.method, figures.to_dict()) for one, figures in zip(logged, computed, strict=True)},
        )
        return logged


def _checked(points: Points) -> list[tuple[float, float]]:
    """Points within their columns' bounds. Raises InputError."""
    return [(sheets.POINT_UM.checked(c, str(c)), sheets.POINT_NA.checked(i, str(i))) for c, i in points]


def _labelled(writer: Writer, typed: Typed, label: str, zone: tzinfo | None) -> dict[str, Value]:
    """With its probe's and its standard's own spelling, and its label."""
    electrodes = known_labels(writer.connection, [str(typed["electrode"])], writer.names)
    if len(electrodes) > 1:
        raise InputError(
            f"electrode: '{shortened(str(typed['electrode']))}' names {len(electrodes)} probes;"
            " accepted: one label, or a file of points with a label in every row (points belong to one probe)"
        )
    row = read(sheets.CALIBRATIONS, {**typed, "calibration": label, "electrode": electrodes[0]}, zone)
    if row.get("standard") is not None:
        row["standard"] = writer.names.spelled("standards", str(row["standard"])) or row["standard"]
    return row


def _labels(writer: Writer, new: Sequence[NewCalibration]) -> list[str]:
    given = [str(one.values.get("calibration") or "") for one in new]
    free = _free_labels(writer, given)
    return [label or next(free) for label in given]


def _free_labels(writer: Writer, taken: Sequence[str]) -> Iterator[str]:
    """The next numbers that no calibration has: C0001, C0002, …"""
    for number in count(queries.newest_id(writer.connection, sheets.CALIBRATIONS) + 1):
        label = f"C{number:04d}"
        if label not in taken and writer.names.spelled("calibrations", label) is None:
            yield label


def _as_calibration(row: dict[str, Value], points: Points) -> queries.Calibration:
    full: dict[str, Any] = {column.name: row.get(column.name) for column in sheets.CALIBRATIONS.columns}
    return queries.Calibration(full, tuple(points), None)


def _slips(
    values: Mapping[str, Any],
    points: Points,
    figures: CalibrationFigures,
    earlier: Sequence[tuple[CalibrationFigures, Sequence[float]]],
) -> list[str]:
    """Likely slips; `earlier`: the probe's comparable calibrations, each with the concentrations used."""
    concentrations, currents = zip(*points, strict=True) if points else ((), ())
    said = likely_slips(
        concentrations,
        currents,
        figures.sensitivity_na_um,
        earlier_sensitivity_na_um=[e.sensitivity_na_um for e, _ in earlier if e.sensitivity_na_um is not None],
        earlier_concentration_um=[c for _, used in earlier for c in used],
        noise_na=values.get("noise_na"),
    )
    return [f"{values['electrode']}: {text}" for text in said]


def _entered_twice(
    values: Mapping[str, Any], points: Sequence[tuple[float, float]], earlier: Sequence[queries.Calibration]
) -> list[str]:
    """`earlier`: the probe's comparable calibrations."""
    new = Readings(values["at"], values["stage"], tuple(points), values.get("sensitivity_na_um"))
    found: queries.Calibration | None = first_double(new, [(readings_of(one), one) for one in earlier])
    if found is None:
        return []
    name, at = found.row["calibration"], shown_moment(found.at)
    how = f"`electrolog strike calibration {name}` takes that one out"
    return [f"{values['electrode']}: {new.said} as {name} of {at}: entered twice? {how}"]


def _earlier(writer: Writer, row: dict[str, Value]) -> list[queries.Calibration]:
    """The probe's comparable calibrations."""
    electrode_id = writer.names.row_id("electrodes", str(row["electrode"]))
    analyte_id = writer.names.row_id("analytes", str(row["analyte"]))
    waveform_id = writer.names.row_id("waveforms", str(row["waveform"]))
    return queries.calibrations(writer.connection, [electrode_id], analyte_id, waveform_id)


def _figured(found: Sequence[queries.Calibration]) -> list[tuple[CalibrationFigures, list[float]]]:
    """With the concentrations used."""
    uncertainties: dict[str, float | None] = {}
    return [(made.figures_of(one, uncertainties), [c for c, _ in one.points]) for one in found]


def _of_the_standard(writer: Writer, row: dict[str, Value]) -> list[str]:
    if row.get("standard") is None:
        return []
    standard = row_by_id(writer.connection, sheets.STANDARDS, writer.names.row_id("standards", str(row["standard"])))
    analyte = row_by_id(writer.connection, sheets.ANALYTES, writer.names.row_id("analytes", str(row["analyte"])))
    text = other_standard(standard["analyte"], analyte["analyte"])
    return [f"{row['electrode']}: {text}"] if text else []
