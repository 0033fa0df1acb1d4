"""Logging: rows are read, checked, looked over for slips and written, all of them or none."""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass
from datetime import datetime, timedelta, tzinfo
from itertools import count
from typing import Any

from electrolog.answers import doubts as asked
from electrolog.answers import figures as made
from electrolog.answers.answer import Answer
from electrolog.answers.handling import split
from electrolog.answers.labels import expanded, known_labels, numbered
from electrolog.errors import DoubtfulEntry, InputError, shortened, unknown, with_article
from electrolog.measure.calibrate import CalibrationFigures
from electrolog.measure.health import other_standard
from electrolog.record import entry, queries, sheets
from electrolog.record.columns import Value
from electrolog.record.journal import Writer
from electrolog.record.readable import row_by_id
from electrolog.record.sheets import Sheet
from electrolog.record.store import Record

Typed = Mapping[str, str | Value]
Points = Sequence[tuple[float, float]]


@dataclass(frozen=True)
class Entered(Answer):
    """A row that is now in the record, and what was doubted and confirmed."""

    sheet: str
    row_id: int
    values: dict[str, Value]
    doubts: tuple[str, ...]


@dataclass(frozen=True)
class NewCalibration:
    """One calibration about to be logged: its columns as typed, its raw points (µM, nA)."""

    values: Typed
    points: Points = ()


def read(sheet: Sheet, typed: Typed, zone: tzinfo | None = None) -> dict[str, Value]:
    """Typed text as the sheet's values; what is None or blank is unknown. Raises InputError."""
    values: dict[str, Value] = {}
    for name, value in typed.items():
        column = sheet.by_name.get(name)
        if column is None:
            raise unknown(f"column of {sheet.name}", name, sheet.by_name)
        if isinstance(value, str):
            values[name] = column.read_typed(value, zone) if value.strip() else None
        else:
            values[name] = value
    for column in sheet.columns:
        if column.required and values.get(column.name) is None:
            raise InputError(f"{column.name}: missing; {with_article(sheet.one)} needs it ({column.about})")
    return values


def log(
    record: Record, sheet: Sheet, typed: Typed, labels: Sequence[str], zone: tzinfo | None, confirmed: bool
) -> list[Entered]:
    """The same event for one probe or several. Raises DoubtfulEntry unless doubts are confirmed."""
    with record.writing() as writer:
        chosen = known_labels(writer.connection, labels, writer.names)
        rows = [read(sheet, {**typed, "electrode": label}, zone) for label in chosen]
        if sheet is sheets.INSPECTIONS:
            _beside_remarks(writer, rows)
        said = _doubts(writer, sheet, rows)
        _confirm(said, confirmed)
        return [_entered(writer, sheet, entry.add(writer, sheet, row), said) for row in rows]


def _beside_remarks(writer: Writer, rows: Sequence[dict[str, Value]]) -> None:
    """A remark and an inspection of one and the same moment: the later entry is put a second later.

    Two inspections of one moment stay a contradiction, and are refused.
    """
    probes = queries.probes(writer.connection, [str(row["electrode"]) for row in rows])
    life = queries.events(writer.connection, [probe["id"] for probe in probes], (sheets.INSPECTIONS,))
    for row in rows:
        taken = {event.at: event.row for event in life.get(str(row["electrode"]), [])}
        at = row["at"]
        while isinstance(at, datetime) and at in taken and (_is_remark(row) or _is_remark(taken[at])):
            row["at"] = at = at + timedelta(seconds=1)


def _is_remark(row: Mapping[str, Any]) -> bool:
    return all(row.get(name) is None for name in ("exposed_length_um", "seal_ok", "background_na", "noise_na"))


def log_plain(record: Record, sheet: Sheet, typed: Typed, zone: tzinfo | None) -> Entered:
    """A row that is no event of a probe: a standard, a waveform, an analyte, a word."""
    values = read(sheet, typed, zone)
    with record.writing() as writer:
        return _entered(writer, sheet, entry.add(writer, sheet, values))


def _entered(writer: Writer, sheet: Sheet, row_id: int, doubts: Sequence[str] = ()) -> Entered:
    """As it now stands in the record, with the record's own spelling of every name."""
    writer.flush()
    row = row_by_id(writer.connection, sheet, row_id)
    return Entered(sheet.name, row_id, {column.name: row[column.name] for column in sheet.columns}, tuple(doubts))


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
        said = _doubts(writer, sheets.CALIBRATIONS, [row for row, _ in rows])
        for (row, points), figures in zip(rows, computed, strict=True):
            earlier = _earlier(writer, row)
            said += asked.entered_twice(row, points, earlier)
            said += asked.of_calibration(row, points, figures, _figured(earlier)) + _of_the_standard(writer, row)
        _confirm(said, confirmed)
        entered = [
            _entered(writer, sheets.CALIBRATIONS, entry.add(writer, sheets.CALIBRATIONS, row, points), said)
            for row, points in rows
        ]
        queries.keep_figures(
            writer,
            {one.row_id: (figures.method, figures.to_dict()) for one, figures in zip(entered, computed, strict=True)},
        )
        return entered


def make_probes(
    record: Record, labels: Sequence[str], count: int | None, batch: Typed, probe: Typed, zone: tzinfo | None
) -> list[str]:
    """New probes, by label or `count` of a batch; a batch that isn't there yet is made with what `batch` says."""
    name = str(batch.get("batch") or "")
    with record.writing() as writer:
        known = writer.names.everything("electrodes")
        if (labels and count is not None) or not (labels or name):
            raise InputError("which probes? accepted: labels, or --count with --batch")
        name = writer.names.spelled("batches", name) or name
        chosen = expanded(labels) if labels else numbered(name, _first_free(name, known), 1 if count is None else count)
        _make_batch(writer, read(sheets.BATCHES, {**batch, "batch": name}, zone) if name else {})
        values = {**probe, "batch": name or None}
        for label in chosen:
            entry.add(writer, sheets.ELECTRODES, read(sheets.ELECTRODES, {**values, "electrode": label}, zone))
        return chosen


def _make_batch(writer: Writer, values: dict[str, Value]) -> None:
    """Adds the batch; for one that is there, what is said of it again must be what is known."""
    if not values:
        return
    label = str(values["batch"])
    if writer.names.spelled("batches", label) is None:
        entry.add(writer, sheets.BATCHES, values)
        return
    said = {name for name, value in values.items() if value is not None} - {"batch"}
    if said:
        raise InputError(
            f"batch '{label}' is there already, and this says more of it ({', '.join(sorted(said))})",
            "correct it with `electrolog amend batch`",
        )


def _first_free(stem: str, known: Mapping[str, object]) -> int:
    prefix = f"{stem}-".casefold()
    taken = [name.removeprefix(prefix) for name in known if name.startswith(prefix)]
    return max((int(tail) for tail in taken if tail.isdigit()), default=0) + 1


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


def _doubts(writer: Writer, sheet: Sheet, rows: Sequence[dict[str, Value]]) -> list[str]:
    if sheet.time_column is None:
        return []
    probes = queries.probes(writer.connection, [str(row["electrode"]) for row in rows])
    life = queries.events(writer.connection, [probe["id"] for probe in probes])
    made_on = {probe["electrode"]: probe["made_on"] for probe in probes}
    return [
        text
        for row in rows
        for text in asked.of_event(sheet, row, life.get(str(row["electrode"]), []), made_on[row["electrode"]])
    ]


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


def _confirm(said: Sequence[str], confirmed: bool) -> None:
    if said and not confirmed:
        raise DoubtfulEntry("; ".join(said), said, "if it is right as it stands, repeat it with --yes")
