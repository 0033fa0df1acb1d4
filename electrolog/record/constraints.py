"""Every rule that a single row can break, as the database itself holds it: named CHECKs, keys, unique indexes.

The migrations make them; the tests hold a migrated database equal to what stands here.
"""

from __future__ import annotations

from typing import Any

from sqlalchemy import (
    CheckConstraint,
    ForeignKeyConstraint,
    Index,
    MetaData,
    PrimaryKeyConstraint,
    Table,
    UniqueConstraint,
    func,
    text,
)
from sqlalchemy.sql.elements import ColumnElement

from electrolog.record import columns as kinds
from electrolog.record import schema
from electrolog.record.columns import LARGEST, number_text
from electrolog.record.names import FOLDED
from electrolog.record.schema import column_name
from electrolog.record.sheets import CALIBRATIONS, POINTS, SHEETS, Sheet

NAMES = {
    "ix": "ix_%(table_name)s_%(column_0_N_name)s",
    "uq": "uq_%(table_name)s_%(column_0_N_name)s",
    "ck": "ck_%(table_name)s_%(constraint_name)s",
    "fk": "fk_%(table_name)s_%(column_0_name)s",
    "pk": "pk_%(table_name)s",
}
_LIVE = text("struck IS NULL")
LED = {CALIBRATIONS.name: {"analyte_id", "electrode_id"}}  # links that an index for more than the link begins with
_UTC_SHAPE = "0000-00-00T00:00:00.000000Z".replace("0", "[0-9]")


def full_metadata() -> MetaData:
    """The schema with everything that guards it."""
    full = MetaData(naming_convention=NAMES)
    for table in schema.metadata.tables.values():
        copied = table.to_metadata(full)
        copied.dialect_options["sqlite"]["strict"] = True
    _guard_journal(full.tables["journal"])
    for sheet in SHEETS:
        _guard(sheet, full.tables[sheet.name])
    _index_cohorts(full.tables["calibrations"])
    derived = {"calibration_figures": "calibrations", "kept_fits": "analytes", "kept_fit_units": "analytes"}
    for name, target in derived.items():
        key = f"{target.removesuffix('s')}_id"
        full.tables[name].append_constraint(ForeignKeyConstraint([key], [f"{target}.id"]))
    return full


def _guard(sheet: Sheet, table: Table) -> None:
    for column in sheet.columns:
        for check in _checks(column):
            table.append_constraint(check)
        if isinstance(column, kinds.Link):
            table.append_constraint(ForeignKeyConstraint([column_name(column)], [f"{column.to}.id"]))
    table.append_constraint(ForeignKeyConstraint(["struck"], ["journal.seq"]))
    if sheet is POINTS:
        table.append_constraint(PrimaryKeyConstraint("calibration_id", "ordinal"))
    else:
        _index(sheet, table)


def _index_cohorts(table: Table) -> None:
    """What came to one cohort since its fit, what it measured on a day, and one probe's share of it, found without
    reading the others'.
    """
    c = table.c
    for name, columns in (("cohort", (c.analyte_id, c.id)), ("cohort_at", (c.analyte_id, c.at))):
        Index(f"ix_{table.name}_{name}", *columns, sqlite_where=_LIVE, postgresql_where=_LIVE)
    Index(f"ix_{table.name}_probe", c.electrode_id, c.analyte_id)


def _guard_journal(table: Table) -> None:
    checks = {
        "action": "action IN ('add', 'amend', 'strike')",
        "hash": "length(hash) = 64 AND length(previous_hash) = 64",
        "seq": "seq > 0",
    }
    for name, rule in checks.items():
        table.append_constraint(CheckConstraint(rule, name=name))
    table.append_constraint(_utc("at"))
    table.append_constraint(UniqueConstraint("hash"))
    Index("ix_journal_sheet_row_id", table.c.sheet, table.c.row_id)
    corrections = schema.CORRECTIONS
    Index("ix_journal_corrections", table.c.seq, sqlite_where=corrections, postgresql_where=corrections)


def _checks(column: kinds.Column) -> list[Any]:
    rule = _rule(column)
    found: list[Any] = [CheckConstraint(rule, name=column.name)] if rule else []
    return [*found, _utc(column.name)] if isinstance(column, kinds.Moment) else found


def _utc(column: str) -> Any:
    """UTC, held by the database: SQLite would keep any text, PostgreSQL's type already knows its zone."""
    return CheckConstraint(f"{column} GLOB '{_UTC_SHAPE}'", name=f"{column}_utc").ddl_if("sqlite")


def _rule(column: kinds.Column) -> str:
    name = column.name
    if isinstance(column, kinds.Choice):
        return f"{name} IN ({', '.join(repr(choice) for choice in column.choices)})"
    if isinstance(column, kinds.Number):
        return _number_rule(column)
    if isinstance(column, kinds.Day):
        return f"{name} LIKE '____-__-__'"
    least, most = _length(column)
    return f"length({name}) BETWEEN {least} AND {most}" if most else ""


def _number_rule(column: kinds.Number) -> str:
    """Infinity passes a one-sided bound, and NaN is above everything in PostgreSQL: both sides are always held."""
    name = column.name
    low = f"{name} >= {number_text(-LARGEST if column.least is None else column.least)}"
    low = low if column.above is None else f"{name} > {number_text(column.above)}"
    high = f"{name} <= {number_text(LARGEST if column.most is None else column.most)}"
    return f"{low} AND {high}" + (f" AND {name} = round({name})" if column.whole else "")


def _length(column: kinds.Column) -> tuple[int, int]:
    """Least and most characters; zeros where the column holds no text of its own."""
    if isinstance(column, kinds.Vertices):
        return 3, kinds.TEXT_LIMIT
    if isinstance(column, kinds.Label) and not isinstance(column, kinds.Link):
        return 1, kinds.LABEL_LIMIT
    return (1, kinds.TEXT_LIMIT) if isinstance(column, kinds.Text) else (0, 0)


def _index(sheet: Sheet, table: Table) -> None:
    """One live row per key; a struck row no longer stands in the way of its correction."""
    Index(
        f"uq_{sheet.name}_live",
        *[_key_part(sheet, table, name) for name in sheet.key],
        unique=True,
        sqlite_where=_LIVE,
        postgresql_where=_LIVE,
    )
    if sheet.name in FOLDED:
        Index(f"ix_{sheet.name}_folded", func.lower(table.c[sheet.key[0]]))
    led = {column_name(sheet.by_name[name]) for name in sheet.key[:1]} | LED.get(sheet.name, set())
    for column in sheet.columns:
        if isinstance(column, kinds.Link) and column_name(column) not in led:
            Index(f"ix_{sheet.name}_{column_name(column)}", table.c[column_name(column)])


def _key_part(sheet: Sheet, table: Table, name: str) -> ColumnElement[Any]:
    """An unknown part of a key counts as one value, or two NULLs would make two rows of the same limit."""
    column = sheet.by_name[name]
    part = table.c[column_name(column)]
    if column.required:
        return part
    return func.coalesce(part, text("0") if isinstance(column, kinds.Link) else text("''"))
