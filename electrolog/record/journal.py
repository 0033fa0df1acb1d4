"""The journal: what happened to the record, in order, each entry chained to the one before by its hash.

An entry is written in the same transaction as the rows that it describes, and holds enough to make them again.
"""

from __future__ import annotations

import hashlib
import json
from collections.abc import Iterator, Mapping
from dataclasses import dataclass, field
from datetime import date, datetime
from typing import Any

from sqlalchemy import Column, Connection, Dialect, Table, func, insert, select

from electrolog.clock import utc_now
from electrolog.record import schema
from electrolog.record.names import Names

FIRST_HASH = "0" * 64


@dataclass(frozen=True)
class Entry:
    seq: int
    at: datetime
    who: str
    action: str
    sheet: str
    row_id: int
    reason: str
    change: dict[str, Any]
    previous_hash: str
    hash: str


@dataclass
class Writer:
    """A write transaction under way. Rows and entries wait for flush(), so that bulk stays bulk."""

    connection: Connection
    who: str
    reason: str = ""
    at: datetime = field(default_factory=utc_now)
    _entries: list[dict[str, Any]] = field(default_factory=list)
    _rows: dict[str, list[dict[str, Any]]] = field(default_factory=dict)
    _tail: tuple[int, str] | None = None
    _next_ids: dict[str, int] = field(default_factory=dict)

    def __post_init__(self) -> None:
        self.names = Names(self.connection)

    def new_id(self, sheet: str) -> int:
        """The next row number. The write lock makes it safe, and the journal can name the row before it is there."""
        if sheet not in self._next_ids:
            newest = select(func.max(schema.tables[sheet].c.id))
            self._next_ids[sheet] = self.connection.execute(newest).scalar() or 0
        self._next_ids[sheet] += 1
        return self._next_ids[sheet]

    def note(self, action: str, sheet: str, row_id: int, change: Mapping[str, Any], reason: str | None = None) -> int:
        """Chains an entry; it reaches the database at flush(), in this transaction. Returns its number."""
        seq, previous = self._tail_now()
        row: dict[str, Any] = {
            "seq": seq + 1,
            "at": self.at,
            "who": self.who,
            "action": action,
            "sheet": sheet,
            "row_id": row_id,
            "reason": self.reason if reason is None else reason,
            "change": canonical(change),
            "previous_hash": previous,
        }
        row["hash"] = entry_hash(row)
        self._entries.append(row)
        self._tail = (seq + 1, row["hash"])
        return seq + 1

    def insert(self, sheet: str, *rows: dict[str, Any]) -> None:
        self._rows.setdefault(sheet, []).extend(rows)

    def flush(self) -> None:
        for sheet in list(schema.tables):
            rows = self._rows.pop(sheet, None)
            if rows:
                insert_many(self.connection, schema.tables[sheet], rows)
        if self._entries:
            insert_many(self.connection, schema.journal, self._entries)
            self._entries = []

    def _tail_now(self) -> tuple[int, str]:
        if self._tail is None:
            self._tail = head(self.connection)
        return self._tail


def insert_many(connection: Connection, table: Table, rows: list[dict[str, Any]]) -> None:
    """Rows with the same columns. SQLite's driver is given them at once: SQLAlchemy's own way costs a bulk import
    more than the database itself does.
    """
    if connection.dialect.name != "sqlite":
        connection.execute(insert(table), rows)
        return
    statement = insert(table).compile(dialect=connection.dialect, column_keys=list(rows[0]))
    columns = [_driver_values(table.c[name], rows, connection.dialect) for name in statement.positiontup or ()]
    connection.exec_driver_sql(str(statement), list(zip(*columns, strict=True)))


def _driver_values(column: Column[Any], rows: list[dict[str, Any]], dialect: Dialect) -> list[Any]:
    values = [row[column.name] for row in rows]
    turned = column.type.dialect_impl(dialect).bind_processor(dialect)
    return list(map(turned, values)) if turned else values


def head(connection: Connection) -> tuple[int, str]:
    """The number and hash of the newest entry: together they name the state of the record."""
    table = schema.journal
    newest = select(table.c.seq, table.c.hash).order_by(table.c.seq.desc()).limit(1)
    row = connection.execute(newest).first()
    return (row.seq, row.hash) if row else (0, FIRST_HASH)


def entry_hash(row: Mapping[str, Any]) -> str:
    """SHA-256 over every column but the hash itself, in a form that has one spelling only."""
    parts = [
        row["seq"],
        schema.fixed_width(row["at"]),
        row["who"],
        row["action"],
        row["sheet"],
        row["row_id"],
        row["reason"],
        row["change"],
        row["previous_hash"],
    ]
    return hashlib.sha256(_HASHED.encode(parts).encode()).hexdigest()


def canonical(change: Mapping[str, Any]) -> str:
    return _CANONICAL.encode(change)


def _plain(value: object) -> str:
    if isinstance(value, datetime):
        return schema.fixed_width(value)
    if isinstance(value, date):
        return value.isoformat()
    raise TypeError(f"{type(value).__name__} has no place in the journal")


_HASHED = json.JSONEncoder(separators=(",", ":"))
_CANONICAL = json.JSONEncoder(sort_keys=True, separators=(",", ":"), default=_plain, allow_nan=False)


def entries(connection: Connection, sheet: str | None = None, row_id: int | None = None) -> Iterator[Entry]:
    """Entries, oldest first; of one sheet or one row if named."""
    query = select(schema.journal).order_by(schema.journal.c.seq)
    if sheet is not None:
        query = query.where(schema.journal.c.sheet == sheet)
    if row_id is not None:
        query = query.where(schema.journal.c.row_id == row_id)
    for row in connection.execute(query.execution_options(yield_per=5000)).mappings():
        yield Entry(**{**row, "change": json.loads(row["change"])})
