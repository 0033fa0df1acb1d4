"""Adding one row: checked against its sheet, its names looked up, written with its journal entry."""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from datetime import datetime
from typing import Any

from sqlalchemy import select

from electrolog.errors import InputError, shortened, unknown, with_article
from electrolog.record import columns as kinds
from electrolog.record import schema, sheets
from electrolog.record.columns import Value
from electrolog.record.journal import Columns, Writer
from electrolog.record.names import Names
from electrolog.record.sheets import Sheet

Points = Sequence[tuple[float, float]]
Row = dict[str, Any]


def add(writer: Writer, sheet: Sheet, values: Mapping[str, Value], points: Points = ()) -> int:
    """Adds a row to a sheet and returns its number; `points` are (µM, nA) of a calibration.

    Values are those that the sheet's columns read. Raises InputError for a value that can't be taken, an
    unknown name, or a key that a live row already has.
    """
    row = resolved(sheet, values, writer.names)
    check_row(sheet, row, bool(points))
    refuse_double(writer, sheet, row)
    refuse_lookalike(sheet, row, writer.names)
    refuse_shared_name(sheet, row, writer.names)
    return insert(writer, sheet, row, points)


def insert(writer: Writer, sheet: Sheet, row: Row, points: Points) -> int:
    """Writes a row that has been checked already."""
    row_id = writer.new_id(sheet.name)
    writer.insert(sheet.name, {"id": row_id, **row})
    change: dict[str, Any] = {"after": known(row)}
    if points:
        change["points"] = [[float(c), float(i)] for c, i in points]
        places = enumerate(change["points"], start=1)
        writer.insert(
            "calibration_points",
            *[
                {"calibration_id": row_id, "ordinal": place, "concentration_um": c, "current_na": i}
                for place, (c, i) in places
            ],
        )
    writer.note("add", sheet.name, row_id, change)
    _remember(sheet, row, row_id, writer.names)
    return row_id


def insert_all(writer: Writer, sheet: Sheet, columns: Columns, points: Sequence[Points]) -> range:
    """Writes rows that have been checked already, given by column, each with its points; returns their numbers."""
    ids = writer.new_ids(sheet.name, len(points))
    writer.insert_columns(sheet.name, {"id": ids, **columns})
    if any(points):
        writer.insert_columns("calibration_points", _by_column(ids, points))
    writer.note_all("add", sheet.name, zip(ids, _added(columns, points), strict=True))
    return ids


def _added(columns: Columns, points: Sequence[Points]) -> Iterator[dict[str, Any]]:
    """What the journal keeps of each row."""
    told = {name: values for name, values in columns.items() if values.count(None) < len(values)}
    for *row, own in zip(*told.values(), points, strict=True):
        after = {name: value for name, value in zip(told, row, strict=True) if value is not None}
        yield {"after": after, "points": own} if own else {"after": after}


def _by_column(ids: Sequence[int], points: Sequence[Points]) -> Columns:
    return {
        "calibration_id": [row_id for row_id, own in zip(ids, points, strict=True) for _ in own],
        "ordinal": [ordinal for own in points for ordinal in range(1, len(own) + 1)],
        "concentration_um": [concentration for own in points for concentration, _ in own],
        "current_na": [current for own in points for _, current in own],
    }


def resolved(sheet: Sheet, values: Mapping[str, Value], names: Names) -> Row:
    """The row as its table keeps it: every column there, names turned into row numbers."""
    for name in values:
        if name not in sheet.by_name:
            raise unknown(f"column of {sheet.name}", name, sheet.by_name)
    return {
        schema.column_name(column): resolved_value(sheet, column, values.get(column.name), names)
        for column in sheet.columns
    }


def resolved_value(sheet: Sheet, column: kinds.Column, value: Value, names: Names) -> Any:
    if value is None or value == "":
        if column.required:
            raise InputError(f"{column.name}: missing; {with_article(sheet.one)} needs it ({column.about})")
        return None
    if isinstance(column, kinds.Link):
        return names.row_id(column.to, str(value))
    if isinstance(column, kinds.Word):
        return names.word(column.kind, str(value))
    return float(value) if isinstance(column, kinds.Number) else value  # type: ignore[arg-type]


def known(row: Row) -> Row:
    return {name: value for name, value in row.items() if value is not None}


RULED = {"calibrations": ("sensitivity_na_um", "sensitivity_se_na_um"), "standards": ("expires_at",)}


def check_row(sheet: Sheet, row: Row, has_points: bool = False) -> None:
    """Rules between the columns of one row; they say nothing of one in which its sheet's RULED are all unknown."""
    if sheet is sheets.CALIBRATIONS:
        _check_factor(row, has_points)
    if sheet is sheets.STANDARDS:
        _check_use_by(row["prepared_at"], row["expires_at"])


def _check_factor(row: Row, has_points: bool) -> None:
    if has_points and row["sensitivity_na_um"] is not None:
        raise InputError(
            "sensitivity_na_um: refused where points exist, since the points give it; accepted: one or the other"
        )
    if row["sensitivity_se_na_um"] is not None and row["sensitivity_na_um"] is None:
        raise InputError("sensitivity_se_na_um: a standard error without its sensitivity; accepted: both, or neither")


def _check_use_by(prepared: datetime, expires: datetime | None) -> None:
    if expires is not None and expires < prepared:
        raise InputError("expires_at: lies before prepared_at; accepted: a later moment")


def refuse_double(writer: Writer, sheet: Sheet, row: Row) -> None:
    if not sheet.key:
        return
    table = schema.tables[sheet.name]
    names = [schema.column_name(sheet.by_name[part]) for part in sheet.key]
    matches = [table.c[name].is_(None) if row[name] is None else table.c[name] == row[name] for name in names]
    found = writer.connection.execute(select(table.c.id).where(*matches, table.c.struck.is_(None))).scalar()
    if found is not None:
        raise InputError(f"{described(sheet, row, found)} is there already", "correct it with `electrolog amend`")


def refuse_lookalike(sheet: Sheet, row: Row, names: Names, itself: str | None = None) -> None:
    """Two labels that differ by case alone would be one probe to a tired eye; `itself`: the row's label so far."""
    if sheet is sheets.TERMS:
        twin, what = names.find_word(row["kind"], row["term"]), "term"
    elif sheet.labelled:
        twin, what = names.spelled(sheet.name, str(row[sheet.key[0]])), sheet.key[0]
    else:
        return
    if twin is not None and twin != itself:
        raise InputError(
            f"{what}: '{shortened(row[what])}' can't be told from '{shortened(twin)}', which is there already;"
            " accepted: a name that can't be mistaken for another"
        )


def refuse_shared_name(sheet: Sheet, row: Row, names: Names, itself: int | None = None) -> None:
    """An analyte goes by its name and its abbreviation, so neither may be another's."""
    if sheet is not sheets.ANALYTES:
        return
    for column in ("analyte", "abbreviation"):
        found = names.find(sheet.name, row[column]) if row[column] else None
        if found not in (None, itself):
            raise InputError(
                f"{column}: '{shortened(row[column])}' is what another analyte is called; accepted: one of its own"
            )


def described(sheet: Sheet, row: Row, row_id: int) -> str:
    return f"{sheet.one} '{shortened(row[sheet.key[0]])}'" if sheet.labelled else f"{sheet.one} {row_id}"


def _remember(sheet: Sheet, row: Row, row_id: int, names: Names) -> None:
    if sheet is sheets.TERMS:
        names.add_word(row["kind"], row["term"])
    elif sheet.labelled:
        names.add(sheet.name, row[sheet.key[0]], row_id)
    if sheet is sheets.ANALYTES and row["abbreviation"]:
        names.add_abbreviation(row["abbreviation"], row_id)
