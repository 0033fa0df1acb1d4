"""The tables and their columns, made from the sheets: what an ordinary command needs to ask and to write.

Constraints and indexes stand in constraints.py: only the database itself needs them, and loading them costs time.
"""

from __future__ import annotations

from datetime import UTC, date, datetime
from functools import lru_cache
from typing import Any

from sqlalchemy import (
    DOUBLE_PRECISION,
    REAL,
    TIMESTAMP,
    Dialect,
    Integer,
    MetaData,
    Table,
    text,
)
from sqlalchemy import Column as SqlColumn
from sqlalchemy import Text as SqlText
from sqlalchemy.types import TypeDecorator, TypeEngine

from electrolog.record import columns as kinds
from electrolog.record.columns import as_utc
from electrolog.record.sheets import POINTS, SHEETS, Sheet

REVISION = "0003"  # the newest migration; a test holds it equal to the newest file in migrations/

metadata = MetaData()


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
    return moment.astimezone(UTC).isoformat(timespec="microseconds").removesuffix("+00:00") + "Z"


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


def _table(sheet: Sheet) -> Table:
    columns = [SqlColumn(column_name(c), _sql_type(c), nullable=not c.required) for c in sheet.columns]
    struck = SqlColumn("struck", Integer)
    if sheet is POINTS:
        return Table(sheet.name, metadata, *columns, SqlColumn("ordinal", Integer, nullable=False), struck)
    identity = SqlColumn("id", Integer, primary_key=True, autoincrement=False)
    return Table(sheet.name, metadata, identity, *columns, struck)


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
    SqlColumn("hash", SqlText, nullable=False),
)

# What can change a fit that was made before: found without reading the whole journal.
CORRECTIONS = text("action <> 'add' AND sheet <> 'limits'")

tables: dict[str, Table] = {sheet.name: _table(sheet) for sheet in SHEETS}
# Derived figures: made by a method of a stated version from what the tables above hold, and made again at will,
# so they are not journalled.
calibration_figures = Table(
    "calibration_figures",
    metadata,
    SqlColumn("calibration_id", Integer, primary_key=True, autoincrement=False),
    SqlColumn("method", SqlText, nullable=False),
    SqlColumn("figures", SqlText, nullable=False),
)
kept_fits = Table(
    "kept_fits",
    metadata,
    SqlColumn("analyte_id", Integer, primary_key=True, autoincrement=False),
    SqlColumn("method", SqlText, nullable=False),
    SqlColumn("fingerprint", SqlText, nullable=False),
    SqlColumn("seen_readings", Integer, nullable=False),
    SqlColumn("seen_correction", Integer, nullable=False),
    SqlColumn("made_at", UtcMoment(), nullable=False),
    SqlColumn("fit", SqlText, nullable=False),
    SqlColumn("seen_newest", Integer),
)
# What a kept fit holds of each unit, apart: who asks about one probe reads no other's.
kept_fit_units = Table(
    "kept_fit_units",
    metadata,
    SqlColumn("analyte_id", Integer, primary_key=True, autoincrement=False),
    SqlColumn("unit", SqlText, primary_key=True),
    SqlColumn("fit", SqlText, nullable=False),
)

# Alembic's own table, described here so that an ordinary command can look at it without loading Alembic.
alembic_version = Table("alembic_version", MetaData(), SqlColumn("version_num", SqlText))
