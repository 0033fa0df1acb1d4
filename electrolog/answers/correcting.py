"""Correcting an entry: by the words a person uses for it, with the figures that rest on it made anew."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from datetime import tzinfo
from typing import Any

from electrolog.answers import figures as made
from electrolog.answers import handling
from electrolog.answers.answer import Answer
from electrolog.errors import unknown
from electrolog.record import amend, earlier, names, queries, schema, sheets
from electrolog.record.columns import Value
from electrolog.record.journal import Writer
from electrolog.record.readable import row_by_id
from electrolog.record.sheets import Sheet
from electrolog.record.store import Record

Sensitivity = tuple[float | None, float | None]


@dataclass(frozen=True)
class Corrected(Answer):
    """What a correction did: column -> (before, after) as people read them; empty for a strike.

    sensitivities: of the calibrations whose figures it changed, (nA/µM, its standard error) before and after.
    """

    what: str
    sheet: str
    changes: dict[str, tuple[Any, Any]]
    sensitivities: dict[str, tuple[Sensitivity, Sensitivity]] = field(default_factory=dict)


def amend_row(
    record: Record,
    one: str,
    name: str,
    typed: Mapping[str, str],
    reason: str,
    zone: tzinfo | None,
    confirmed: bool = False,
) -> Corrected:
    """Amends `calibration C0012`, `coating 17` or `point C0012/3`. An empty text makes a column unknown.

    Raises DoubtfulEntry where somebody else lately amended the same, unless confirmed.
    """
    with record.writing(reason) as writer:
        sheet, row_id, ordinal = _place(writer, one, name)
        before = {} if ordinal else row_by_id(writer.connection, sheet, row_id) if _live(writer, sheet, row_id) else {}
        if sheet is sheets.CALIBRATIONS:
            typed = handling.amended(before.get("note"), typed)
        values = {column: _read(sheet, column, text, zone) for column, text in typed.items()}
        if not confirmed:
            columns = {schema.column_name(sheet.by_name[column]) for column in values}
            earlier.refuse_unseen(writer, sheet.name, row_id, ordinal, columns)
        changed = amend.amend(writer, sheet, row_id, values, ordinal)
        sensitivities = _make_figures_anew(writer, sheet, row_id)
        plain = {column.removesuffix("_id"): pair for column, pair in changed.items()}
        named = {column: (before.get(column, old), values.get(column, new)) for column, (old, new) in plain.items()}
        if sheet is sheets.CALIBRATIONS and "note" in named:
            old, new = named.pop("note")
            named |= handling.changes(old, str(new) if new else None)
        return Corrected(f"{sheet.one} {name}", sheet.name, named, sensitivities)


def strike_row(record: Record, one: str, name: str, reason: str) -> Corrected:
    with record.writing(reason) as writer:
        sheet, row_id, ordinal = _place(writer, one, name)
        amend.strike(writer, sheet, row_id, ordinal)
        return Corrected(f"{sheet.one} {name}", sheet.name, {}, _make_figures_anew(writer, sheet, row_id))


def _place(writer: Writer, one: str, name: str) -> tuple[Sheet, int, int | None]:
    sheet = names.sheet_called(one)
    if sheet is not sheets.POINTS:
        return (*names.find_row(writer.connection, one, name), None)
    label, ordinal = names.point_place(name)
    return sheet, writer.names.row_id("calibrations", label), ordinal


def _live(writer: Writer, sheet: Sheet, row_id: int) -> bool:
    return amend.is_live(writer.connection, sheet, row_id)


def _read(sheet: Sheet, column: str, text: str, zone: tzinfo | None) -> Value:
    if column not in sheet.by_name:
        raise unknown(f"column of {sheet.name}", column, sheet.by_name)
    return sheet.by_name[column].read_typed(text, zone) if text.strip() else None


def _make_figures_anew(writer: Writer, sheet: Sheet, row_id: int) -> dict[str, tuple[Sensitivity, Sensitivity]]:
    """Figures rest on points, noise and the standard's uncertainty; a correction of these reaches them at once."""
    writer.flush()
    if sheet in (sheets.CALIBRATIONS, sheets.POINTS):
        found = queries.calibrations_by_id(writer.connection, [row_id])
    elif sheet is sheets.STANDARDS:
        found = queries.calibrations_on_standard(writer.connection, row_id)
    else:
        return {}
    uncertainties = made.standards_uncertainties(writer.connection)
    fresh = {one.row["id"]: made.computed(one, uncertainties) for one in found}
    queries.keep_figures(writer, {key: (figures.method, figures.to_dict()) for key, figures in fresh.items()})
    told = {}
    for one in found:
        told[one.row["calibration"]] = _sensitivity(one.figures), _sensitivity(vars(fresh[one.row["id"]]))
    return {label: pair for label, pair in told.items() if pair[0] != pair[1]}


def _sensitivity(figures: Mapping[str, Any] | None) -> Sensitivity:
    known = figures or {}
    return known.get("sensitivity_na_um"), known.get("sensitivity_se_na_um")
