"""A record of many labs, filled past the record's door: one lab copied under other names, in the database itself.

Rows of all labs alternate, as they would have come in over the years: a lab's rows, and a probe's, lie far apart, each
on a page of its own. Journal entries have their true size and number but form no valid chain (to hash them anew would
take longer than all the rest): such a record is for asking, not for `verify`.
"""

from __future__ import annotations

import sqlite3
from collections.abc import Iterator
from contextlib import closing
from dataclasses import dataclass
from pathlib import Path

from sqlalchemy import Connection, MetaData, Table, text

from electrolog.lab import set_up
from electrolog.record import schema
from electrolog.record.store import Record, connected
from tests.scale.one_lab import NAME

SHARED = ("terms", "waveforms")  # words of all labs: taken over once, as they stand
LABELS = ("analyte", "batch", "electrode", "standard", "calibration", "rig", "unit", "fit")
LINKS = {
    "batch_id": "batches",
    "electrode_id": "electrodes",
    "analyte_id": "analytes",
    "standard_id": "standards",
    "calibration_id": "calibrations",
    "struck": "journal",
    "seen_correction": "journal",
    "seen_newest": "calibrations",
}
CALLED = "'lab' || substr(CAST(1000 + labs.k AS TEXT), 2)"  # as long as NAME, for up to a thousand labs


@dataclass(frozen=True)
class Copies:
    """SQL for the numbers of the copies: first come the rows that every record is made with, `made` by table."""

    labs: int
    made: dict[str, int]

    def number(self, table: str, column: str) -> str:
        made = self.made.get(table, 0)
        return f"({made} + (t.{column} - {made + 1}) * {self.labs} + labs.k + 1)"


def fill(where: str, template: Path, labs: int) -> Record:
    """A new record at `where` with so many labs, each as large as the template's."""
    set_up(where)
    record = connected(where)
    with record.engine.connect() as connection:
        if record.is_file:
            driver = connection.connection.driver_connection
            assert driver is not None
            for pragma in ("foreign_keys = OFF", "synchronous = OFF", "cache_size = -500000"):
                driver.execute(f"PRAGMA {pragma}")
            driver.execute("ATTACH ? AS template", (str(template),))
        else:
            connection.exec_driver_sql("SET session_replication_role = replica")
            connection.exec_driver_sql("SET maintenance_work_mem = '1GB'")
            _stage(connection, template)
        connection.commit()
        _copy_labs(connection, labs)
    _settle(record)
    return record


def _stage(connection: Connection, template: Path) -> None:
    """The template's rows beside the record, by COPY."""
    connection.exec_driver_sql("CREATE SCHEMA template")
    beside = MetaData(schema="template")
    driver = connection.connection.driver_connection
    assert driver is not None
    with closing(sqlite3.connect(template)) as source:
        for table in schema.metadata.tables.values():
            table.to_metadata(beside, schema="template").create(connection)
            columns = ", ".join(f'"{name}"' for name in column_names(table))
            rows = source.execute(f"SELECT {columns} FROM {table.name}")
            with driver.cursor().copy(f"COPY template.{table.name} ({columns}) FROM STDIN") as copy:
                for row in rows:
                    copy.write_row(row)


def _copy_labs(connection: Connection, labs: int) -> None:
    tables = schema.metadata.tables
    made = {name: _newest(connection, table) for name, table in tables.items() if name in ("analytes", "journal")}
    copies = Copies(labs, {**made, "waveforms": 0})
    connection.exec_driver_sql("CREATE TEMPORARY TABLE labs (k INTEGER PRIMARY KEY)")
    connection.execute(text("INSERT INTO labs VALUES (:k)"), [{"k": k} for k in range(labs)])
    indexes = list(_dropped_indexes(connection))
    for name, table in tables.items():
        if name in SHARED:
            rest = f"WHERE id NOT IN (SELECT id FROM {name})"
            connection.exec_driver_sql(f"INSERT INTO {name} SELECT * FROM template.{name} {rest}")
        else:
            connection.exec_driver_sql(_copying(table, copies, connection.dialect.name))
        connection.commit()
    for statement in indexes:
        connection.exec_driver_sql(statement)
        connection.commit()


def column_names(table: Table) -> list[str]:
    return [column.name for column in table.columns]


def _newest(connection: Connection, table: Table) -> int:
    (key,) = table.primary_key.columns
    return connection.exec_driver_sql(f"SELECT max({key.name}) FROM {table.name}").scalar() or 0


def _copying(table: Table, copies: Copies, dialect: str) -> str:
    columns = ", ".join(f'"{name}"' for name in column_names(table))
    values = ", ".join(_value(table.name, name, copies) for name in column_names(table))
    key = "seq" if table.name == "journal" else column_names(table)[0]
    # The template's rows in the outer loop, so that the labs alternate.
    to_each = "CROSS JOIN labs"
    if dialect == "postgresql":
        to_each = f"CROSS JOIN LATERAL generate_series(0, {copies.labs - 1} + 0 * t.{key}) AS labs (k)"
    first = copies.made.get(table.name, 0)
    rows = f"template.{table.name} AS t {to_each} WHERE t.{key} > {first}"
    return f"INSERT INTO {table.name} ({columns}) SELECT {values} FROM {rows}"


def _value(table: str, column: str, copies: Copies) -> str:
    if column in ("id", "seq"):
        return copies.number(table, column)
    if table == "journal" and column == "row_id":
        return copies.number("", column)
    if column in ("hash", "previous_hash"):
        return f"substr(t.{column}, 1, {64 - len(NAME)}) || {CALLED}"
    if column in LINKS:
        return copies.number(LINKS[column], column)
    return f"replace(t.{column}, '{NAME}', {CALLED})" if column in LABELS else f't."{column}"'


def _dropped_indexes(connection: Connection) -> Iterator[str]:
    """Built at once in the end, in a fraction of the time; the statements that bring them back."""
    found = "SELECT name, sql FROM sqlite_master WHERE type = 'index' AND sql IS NOT NULL"
    if connection.dialect.name == "postgresql":
        found = (
            "SELECT indexname, indexdef FROM pg_indexes WHERE schemaname = 'public'"
            " AND indexname NOT IN (SELECT conname FROM pg_constraint)"
        )
    for name, statement in connection.exec_driver_sql(found).all():
        connection.exec_driver_sql(f"DROP INDEX {name}")
        yield str(statement)
    if connection.dialect.name == "postgresql":
        connection.exec_driver_sql("ALTER TABLE journal DROP CONSTRAINT uq_journal_hash")
        yield "ALTER TABLE journal ADD CONSTRAINT uq_journal_hash UNIQUE (hash)"


def _settle(record: Record) -> None:
    """A server's housekeeping would come round to it by itself; a file has none, and gets none."""
    if record.is_file:
        return
    with record.engine.connect().execution_options(isolation_level="AUTOCOMMIT") as connection:
        connection.exec_driver_sql("DROP SCHEMA template CASCADE")
        connection.exec_driver_sql("VACUUM (ANALYZE)")
        connection.exec_driver_sql("CHECKPOINT")
