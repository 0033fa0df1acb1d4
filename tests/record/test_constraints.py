"""Whatever goes around electrolog is still held by the database: each bad row is refused in raw SQL."""

from __future__ import annotations

from collections.abc import Iterator
from typing import Any

import pytest
from sqlalchemy import Connection, text
from sqlalchemy.exc import DBAPIError

from electrolog.lab import Lab
from electrolog.record import columns as kinds
from electrolog.record import schema
from electrolog.record.columns import LABEL_LIMIT, LARGEST, TEXT_LIMIT, Column
from electrolog.record.sheets import LIMITS, POINTS, SHEETS, Sheet

NONE_THERE = 987654
MOMENT = "2026-02-01T10:00:00.000000Z"


def a_value(column: Column) -> Any:
    """One that the column takes."""
    if isinstance(column, kinds.Link):
        return 2 if column.to == "electrodes" else 1  # the second probe isn't retired
    if isinstance(column, kinds.Number):
        low = column.above if column.above is not None else column.least
        return 1.0 if low is None else low + 1.0
    if isinstance(column, kinds.Choice):
        return column.choices[-1]
    if isinstance(column, kinds.Moment):
        return MOMENT
    return "2026-02-01" if isinstance(column, kinds.Day) else "new"


def bad_values(column: Column) -> Iterator[Any]:
    """Values that no row of the column may have, on either engine."""
    if column.required:
        yield None
    if isinstance(column, kinds.Link):
        yield from (NONE_THERE, "nonsense")
    elif isinstance(column, kinds.Number):
        yield from ("nonsense", float("inf"), float("-inf"), LARGEST * 10, -LARGEST * 10)
        yield from [column.above] if column.above is not None else []
        yield from [column.least - 1.0] if column.least is not None else []
        yield from [column.most * 1.001] if column.most is not None else []
        yield from [1.5] if column.whole else []
    elif isinstance(column, kinds.Choice):
        yield from ("nonsense", "")
    elif isinstance(column, kinds.Label):
        yield from ("", "x" * (LABEL_LIMIT + 1))
    elif isinstance(column, kinds.Text):
        yield from ("", "x" * (TEXT_LIMIT + 1))
    elif isinstance(column, kinds.Day):
        yield from ("", "yesterday", "1.2.2026")
    else:
        yield from ("", *["nonsense"] * isinstance(column, kinds.Moment))


ONLY_SQLITE = ("2026-02-01T10:00:00.000000+01:00", "2026-02-01 10:00:00.000000", "2026-02-01T10:00:00Z", MOMENT.lower())


def row_of(sheet: Sheet, number: int) -> dict[str, Any]:
    row = {schema.column_name(column): a_value(column) for column in sheet.columns}
    return {**row, "ordinal": number} if sheet is POINTS else {"id": number, **row}


class Attempt:
    """A transaction on the record that is never kept; each statement may fail on its own."""

    def __init__(self, connection: Connection) -> None:
        self.connection = connection
        self.on_sqlite = connection.dialect.name == "sqlite"

    def insert(self, sheet: Sheet, row: dict[str, Any]) -> None:
        names = ", ".join(row)
        self.run(f"INSERT INTO {sheet.name} ({names}) VALUES ({', '.join(f':{name}' for name in row)})", row)

    def run(self, statement: str, values: dict[str, Any] | None = None) -> None:
        with self.connection.begin_nested():
            self.connection.execute(text(statement), values or {})

    def is_refused(self, sheet: Sheet, row: dict[str, Any]) -> bool:
        keep = self.connection.begin_nested()
        try:
            self.insert(sheet, row)
        except DBAPIError:
            return True
        finally:
            keep.rollback()
        return False


@pytest.fixture
def attempt(shared: Lab) -> Iterator[Attempt]:
    with shared.record.engine.execution_options(electrolog_writes=True).connect() as connection:
        yield Attempt(connection)
        connection.rollback()


@pytest.mark.parametrize("sheet", SHEETS, ids=lambda sheet: sheet.name)
def test_a_bad_value_is_refused_in_every_column(attempt: Attempt, sheet: Sheet) -> None:
    row = row_of(sheet, 500)
    assert not attempt.is_refused(sheet, row)
    taken = []
    for column in sheet.columns:
        bad = [*bad_values(column), *(ONLY_SQLITE if isinstance(column, kinds.Moment) and attempt.on_sqlite else ())]
        # NaN is NULL to SQLite, so a column that may be unknown takes it as unknown.
        nan = isinstance(column, kinds.Number) and (column.required or not attempt.on_sqlite)
        for value in [*bad, *([float("nan")] if nan else [])]:
            if not attempt.is_refused(sheet, {**row, schema.column_name(column): value}):
                taken.append(f"{column.name}: {str(value)[:40]!r}")
    assert taken == []


@pytest.mark.parametrize("sheet", SHEETS, ids=lambda sheet: sheet.name)
def test_a_row_can_be_struck_only_by_an_entry_of_the_journal(attempt: Attempt, sheet: Sheet) -> None:
    assert attempt.is_refused(sheet, {**row_of(sheet, 500), "struck": NONE_THERE})
    assert not attempt.is_refused(sheet, {**row_of(sheet, 500), "struck": 1})


@pytest.mark.parametrize("sheet", [sheet for sheet in SHEETS if sheet.key], ids=lambda sheet: sheet.name)
def test_a_key_can_be_live_only_once(attempt: Attempt, sheet: Sheet) -> None:
    first, second = row_of(sheet, 500), row_of(sheet, 501)
    attempt.insert(sheet, first)
    assert attempt.is_refused(sheet, second)
    assert not attempt.is_refused(sheet, {**second, "struck": 1})
    attempt.run(f"UPDATE {sheet.name} SET struck = 1 WHERE id = 500")
    assert not attempt.is_refused(sheet, second)


def test_an_unknown_part_of_a_limits_key_counts_as_one_value(attempt: Attempt) -> None:
    everywhere = {**row_of(LIMITS, 500), "analyte_id": None, "project": None}
    attempt.insert(LIMITS, everywhere)
    assert attempt.is_refused(LIMITS, {**everywhere, "id": 501})
    assert not attempt.is_refused(LIMITS, {**everywhere, "id": 501, "project": "p"})


def test_a_points_place_is_its_own(attempt: Attempt) -> None:
    assert attempt.is_refused(POINTS, row_of(POINTS, 1))


@pytest.mark.parametrize("sheet", SHEETS, ids=lambda sheet: sheet.name)
def test_no_row_is_ever_deleted(attempt: Attempt, sheet: Sheet) -> None:
    attempt.insert(sheet, row_of(sheet, 500))
    with pytest.raises(DBAPIError, match="keeps every row"):
        attempt.run(f"DELETE FROM {sheet.name}")


@pytest.mark.parametrize(
    "statement", ["DELETE FROM journal", "UPDATE journal SET reason = 'x'", "UPDATE journal SET seq = seq"]
)
def test_the_journal_is_only_ever_added_to(attempt: Attempt, statement: str) -> None:
    with pytest.raises(DBAPIError, match=r"append-only|keeps every row"):
        attempt.run(statement)


@pytest.mark.parametrize("name", [*(sheet.name for sheet in SHEETS), "journal"])
def test_no_table_is_ever_emptied_at_once(attempt: Attempt, name: str) -> None:
    if attempt.on_sqlite:
        pytest.skip("SQLite has no TRUNCATE")
    with pytest.raises(DBAPIError, match="keeps every row"):
        attempt.run(f"TRUNCATE {name} CASCADE")


@pytest.mark.parametrize(
    ("column", "value"),
    [("action", "erase"), ("hash", "short"), ("seq", 0), ("seq", 1), ("change", None), ("who", None), ("at", "soon")],
)
def test_a_bad_entry_of_the_journal_is_refused(attempt: Attempt, column: str, value: Any) -> None:
    row = {"seq": 9999, "at": MOMENT, "who": "x", "action": "add", "sheet": "terms", "row_id": 1, "reason": ""}
    row |= {"change": "{}", "previous_hash": "0" * 64, "hash": "f" * 64, column: value}
    names = ", ".join(row)
    with pytest.raises(DBAPIError):
        attempt.run(f"INSERT INTO journal ({names}) VALUES ({', '.join(f':{name}' for name in row)})", row)
