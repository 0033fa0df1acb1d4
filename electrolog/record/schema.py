"""The tables, made from the sheets. Every rule that a single row can break is a named CHECK in the database itself."""

from __future__ import annotations

from datetime import UTC, date, datetime
from functools import lru_cache
from typing import Any

from sqlalchemy import (
    DOUBLE_PRECISION,
    REAL,
    TIMESTAMP,
    CheckConstraint,
    Dialect,
    ForeignKey,
    Index,
    Integer,
    MetaData,
    PrimaryKeyConstraint,
    Table,
    func,
    text,
)
from sqlalchemy import Column as SqlColumn
from sqlalchemy import Text as SqlText
from sqlalchemy.sql.elements import ColumnElement
from sqlalchemy.types import TypeDecorator, TypeEngine

from electrolog.record import columns as kinds
from electrolog.record.columns import as_utc, number_text
from electrolog.record.sheets import POINTS, SHEETS, Sheet

REVISION = "0001"  # the newest migration; a test holds it equal to the newest file in migrations/

metadata = MetaData(
    naming_convention={
        "ix": "ix_%(table_name)s_%(column_0_N_name)s",
        "uq": "uq_%(table_name)s_%(column_0_N_name)s",
        "ck": "ck_%(table_name)s_%(constraint_name)s",
        "fk": "fk_%(table_name)s_%(column_0_name)s",
        "pk": "pk_%(table_name)s",
    }
)


class UtcMoment(TypeDecorator[datetime]):
    """UTC only. In SQLite a text of fixed width, so that its order is the order of time and a CHECK can hold it."""

    impl = SqlText
    cache_ok = True

    def load_dialect_impl(self, dialect: Dialect) -> TypeEngine[Any]:
        if dialect.name == "postgresql":
            return dialect.type_descriptor(TIMESTAMP(timezone=True))
        return dialect.type_descriptor(SqlText())

    def process_bind_param(self, value: datetime | None, dialect: Dialect) -> Any:
        if value is None or dialect.name == "postgresql":
            return value
        return fixed_width(value)

    def process_result_value(self, value: Any, dialect: Dialect) -> datetime | None:
        if value is None:
            return None
        return as_utc(value if isinstance(value, datetime) else datetime.fromisoformat(value))


class IsoDay(TypeDecorator[date]):
    """A calendar date as ISO text on both engines: a STRICT table knows no date type."""

    impl = SqlText
    cache_ok = True

    def process_bind_param(self, value: date | None, dialect: Dialect) -> str | None:
        return None if value is None else value.isoformat()

    def process_result_value(self, value: str | None, dialect: Dialect) -> date | None:
        return None if value is None else date.fromisoformat(value)


@lru_cache(maxsize=1024)
def fixed_width(moment: datetime) -> str:
    """One text for one moment. Kept for a while: a row, its journal entry and the entry's hash ask in turn."""
    return moment.astimezone(UTC).replace(tzinfo=None).isoformat(timespec="microseconds") + "Z"


Real: TypeEngine[float] = REAL().with_variant(
    DOUBLE_PRECISION(), "postgresql"
)  # REAL is 8 bytes in SQLite, 4 in PostgreSQL


def column_name(column: kinds.Column) -> str:
    return f"{column.name}_id" if isinstance(column, kinds.Link) else column.name


def _sql_type(column: kinds.Column) -> TypeEngine[Any]:
    if isinstance(column, kinds.Link):
        return Integer()
    if isinstance(column, kinds.Number):
        return Real
    if isinstance(column, kinds.Moment):
        return UtcMoment()
    return IsoDay() if isinstance(column, kinds.Day) else SqlText()


def _sql_column(column: kinds.Column) -> SqlColumn[Any]:
    keys = [ForeignKey(f"{column.to}.id")] if isinstance(column, kinds.Link) else []
    return SqlColumn(column_name(column), _sql_type(column), *keys, nullable=not column.required)


def _checks(column: kinds.Column) -> list[CheckConstraint]:
    rule = _rule(column)
    return [CheckConstraint(rule, name=column.name)] if rule else []


def _rule(column: kinds.Column) -> str:
    name = column.name
    if isinstance(column, kinds.Choice):
        return f"{name} IN ({', '.join(repr(choice) for choice in column.choices)})"
    if isinstance(column, kinds.Number):
        # Infinity passes a one-sided bound, and NaN is above everything in PostgreSQL: both sides are always held.
        low = f"{name} > {number_text(column.above)}" if column.above is not None else f"{name} >= -1e300"
        low = f"{name} >= {number_text(column.least)}" if column.least is not None else low
        return f"{low} AND {name} <= {number_text(column.most if column.most is not None else 1e300)}"
    if isinstance(column, kinds.Label) and not isinstance(column, kinds.Link):
        return f"length({name}) BETWEEN 1 AND {kinds.LABEL_LIMIT}"
    if isinstance(column, kinds.Text):
        return f"length({name}) BETWEEN 1 AND {kinds.TEXT_LIMIT}"
    return ""


def _moment_checks(sheet: Sheet) -> list[CheckConstraint]:
    """UTC, held by the database: SQLite would keep any text, PostgreSQL's type already knows its zone."""
    shape = "____-__-__T__:__:__.______Z"
    return [
        CheckConstraint(f"{column.name} LIKE '{shape}'", name=f"{column.name}_utc").ddl_if("sqlite")
        for column in sheet.columns
        if isinstance(column, kinds.Moment)
    ]


def _table(sheet: Sheet) -> Table:
    rules = [check for column in sheet.columns for check in _checks(column)] + _moment_checks(sheet)
    columns = [_sql_column(column) for column in sheet.columns]
    struck = SqlColumn("struck", Integer, ForeignKey("journal.seq"))
    if sheet is POINTS:
        place = SqlColumn("ordinal", Integer, nullable=False)
        keys = PrimaryKeyConstraint("calibration_id", "ordinal")
        return Table(sheet.name, metadata, *columns, place, struck, keys, *rules, sqlite_strict=True)
    identity = SqlColumn("id", Integer, primary_key=True, autoincrement=False)
    table = Table(sheet.name, metadata, identity, *columns, struck, *rules, sqlite_strict=True)
    _index(sheet, table)
    return table


def _index(sheet: Sheet, table: Table) -> None:
    """One live row per key; a struck row no longer stands in the way of its correction."""
    live = text("struck IS NULL")
    Index(
        f"uq_{sheet.name}_live",
        *[_key_part(sheet, table, name) for name in sheet.key],
        unique=True,
        sqlite_where=live,
        postgresql_where=live,
    )
    leading = column_name(sheet.by_name[sheet.key[0]]) if sheet.key else ""
    for column in sheet.columns:
        if isinstance(column, kinds.Link) and column_name(column) != leading:
            Index(f"ix_{sheet.name}_{column_name(column)}", table.c[column_name(column)])


def _key_part(sheet: Sheet, table: Table, name: str) -> ColumnElement[Any]:
    """An unknown part of a key counts as one value, or two NULLs would make two rows of the same limit."""
    column = sheet.by_name[name]
    part = table.c[column_name(column)]
    if column.required:
        return part
    return func.coalesce(part, text("0") if isinstance(column, kinds.Link) else text("''"))


journal = Table(
    "journal",
    metadata,
    SqlColumn("seq", Integer, primary_key=True, autoincrement=False),
    SqlColumn("at", UtcMoment(), nullable=False),
    SqlColumn("who", SqlText, nullable=False),
    SqlColumn("action", SqlText, nullable=False),
    SqlColumn("sheet", SqlText, nullable=False),
    SqlColumn("row_id", Integer, nullable=False),
    SqlColumn("reason", SqlText, nullable=False),
    SqlColumn("change", SqlText, nullable=False),
    SqlColumn("previous_hash", SqlText, nullable=False),
    SqlColumn("hash", SqlText, nullable=False, unique=True),
    CheckConstraint("action IN ('add', 'amend', 'strike')", name="action"),
    CheckConstraint("length(hash) = 64 AND length(previous_hash) = 64", name="hash"),
    CheckConstraint("seq > 0", name="seq"),
    CheckConstraint("at LIKE '____-__-__T__:__:__.______Z'", name="at_utc").ddl_if("sqlite"),
    Index("ix_journal_sheet_row_id", "sheet", "row_id"),
    sqlite_strict=True,
)

# What can change a fit that was made before: found without reading the whole journal.
CORRECTIONS = text("action <> 'add' AND sheet <> 'limits'")
Index("ix_journal_corrections", journal.c.seq, sqlite_where=CORRECTIONS, postgresql_where=CORRECTIONS)

tables: dict[str, Table] = {sheet.name: _table(sheet) for sheet in SHEETS}
Index(
    "ix_calibrations_analyte_waveform",
    tables["calibrations"].c.analyte_id,
    tables["calibrations"].c.waveform_id,
)

# Derived figures: made by a method of a stated version from what the tables above hold, and made again at will,
# so they are not journalled.
calibration_figures = Table(
    "calibration_figures",
    metadata,
    SqlColumn("calibration_id", Integer, ForeignKey("calibrations.id"), primary_key=True),
    SqlColumn("method", SqlText, nullable=False),
    SqlColumn("figures", SqlText, nullable=False),
    sqlite_strict=True,
)
kept_fits = Table(
    "kept_fits",
    metadata,
    SqlColumn("analyte_id", Integer, ForeignKey("analytes.id"), primary_key=True),
    SqlColumn("method", SqlText, nullable=False),
    SqlColumn("fingerprint", SqlText, nullable=False),
    SqlColumn("seen_readings", Integer, nullable=False),
    SqlColumn("seen_correction", Integer, nullable=False),
    SqlColumn("made_at", UtcMoment(), nullable=False),
    SqlColumn("fit", SqlText, nullable=False),
    sqlite_strict=True,
)

# Alembic's own table, described here so that an ordinary command can look at it without loading Alembic.
alembic_version = Table("alembic_version", MetaData(), SqlColumn("version_num", SqlText))


def table_of(sheet: Sheet) -> Table:
    return tables[sheet.name]
