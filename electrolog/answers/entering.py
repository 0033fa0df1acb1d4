"""Logging: rows are read, checked, looked over for slips and written, all of them or none."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from datetime import datetime, timedelta, tzinfo
from typing import Any

from electrolog.answers import doubts as asked
from electrolog.answers.answer import Answer
from electrolog.answers.labels import expanded, known_labels, numbered
from electrolog.errors import DoubtfulEntry, InputError, unknown, with_article
from electrolog.record import entry, queries, sheets
from electrolog.record.columns import Value
from electrolog.record.journal import Writer
from electrolog.record.readable import row_by_id
from electrolog.record.sheets import Sheet
from electrolog.record.store import Record

Typed = Mapping[str, str | Value]


@dataclass(frozen=True)
class Entered(Answer):
    """A row that is now in the record, and what was doubted and confirmed."""

    sheet: str
    row_id: int
    values: dict[str, Value]
    doubts: tuple[str, ...]


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
        said = doubts_of(writer, sheet, rows)
        confirm(said, confirmed)
        return [entered(writer, sheet, entry.add(writer, sheet, row), said) for row in rows]


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
        return entered(writer, sheet, entry.add(writer, sheet, values))


def entered(writer: Writer, sheet: Sheet, row_id: int, doubts: Sequence[str] = ()) -> Entered:
    """As it now stands in the record, with the record's own spelling of every name."""
    writer.flush()
    row = row_by_id(writer.connection, sheet, row_id)
    return Entered(sheet.name, row_id, {column.name: row[column.name] for column in sheet.columns}, tuple(doubts))


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


def doubts_of(writer: Writer, sheet: Sheet, rows: Sequence[dict[str, Value]]) -> list[str]:
    """About new events, as they were read."""
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


def confirm(said: Sequence[str], confirmed: bool) -> None:
    if said and not confirmed:
        raise DoubtfulEntry("; ".join(said), said, "if it is right as it stands, repeat it with --yes")
