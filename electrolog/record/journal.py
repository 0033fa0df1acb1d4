"""The journal: what happened to the record, in order, each entry chained to the one before by its hash.

An entry is written in the same transaction as the rows that it describes, and holds enough to make them again.
"""

from __future__ import annotations

import hashlib
import json
from collections.abc import Callable, Iterable, Iterator, Mapping, Sequence
from dataclasses import dataclass, field
from datetime import date, datetime
from itertools import chain
from typing import Any

from sqlalchemy import Column, Connection, Dialect, Table, func, insert, select

from electrolog.clock import utc_now
from electrolog.record import schema
from electrolog.record.names import Names

Columns = Mapping[str, Sequence[Any]]
FIRST_HASH = "0" * 64
ROWS_AT_ONCE = 100  # in one statement: of the widest table far fewer values than SQLite takes


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
    _entries: list[tuple[Any, ...]] = field(default_factory=list)
    _rows: dict[str, list[dict[str, Any]]] = field(default_factory=dict)
    _tail: tuple[int, str] | None = None
    _next_ids: dict[str, int] = field(default_factory=dict)

    def __post_init__(self) -> None:
        self.names = Names(self.connection)

    def new_id(self, sheet: str) -> int:
        """The next row number. The write lock makes it safe, and the journal can name the row before it is there."""
        return self.new_ids(sheet, 1)[0]

    def new_ids(self, sheet: str, count: int) -> range:
        if sheet not in self._next_ids:
            newest = select(func.max(schema.tables[sheet].c.id))
            self._next_ids[sheet] = (self.connection.execute(newest).scalar() or 0) + 1
        first = self._next_ids[sheet]
        self._next_ids[sheet] = first + count
        return range(first, first + count)

    def note(self, action: str, sheet: str, row_id: int, change: Mapping[str, Any], reason: str | None = None) -> int:
        """Chains an entry; it reaches the database at flush(), in this transaction. Returns its number."""
        return self.note_all(action, sheet, [(row_id, change)], reason)

    def note_all(
        self, action: str, sheet: str, changes: Iterable[tuple[int, Mapping[str, Any]]], reason: str | None = None
    ) -> int:
        """Chains an entry for each (row number, change), hashed in one pass. Returns the last one's number."""
        seq, previous = self._tail_now()
        why = self.reason if reason is None else reason
        hashed = hasher(self.at, self.who, action, sheet, why)
        for row_id, change in changes:
            seq, before, text = seq + 1, previous, canonical(change)
            previous = hashed(seq, row_id, text, before)
            self._entries.append((seq, self.at, self.who, action, sheet, row_id, why, text, before, previous))
        self._tail = (seq, previous)
        return seq

    def insert(self, sheet: str, *rows: dict[str, Any]) -> None:
        self._rows.setdefault(sheet, []).extend(rows)

    def insert_columns(self, sheet: str, columns: Columns) -> None:
        """Rows given by column, written at once, after those that wait."""
        self.flush()
        insert_columns(self.connection, schema.tables[sheet], columns)

    def flush(self) -> None:
        for sheet in list(schema.tables):
            rows = self._rows.pop(sheet, None)
            if rows:
                insert_many(self.connection, schema.tables[sheet], rows)
        if self._entries:
            by_column = zip(schema.journal.c.keys(), zip(*self._entries, strict=True), strict=True)
            insert_columns(self.connection, schema.journal, dict(by_column))
            self._entries = []

    def _tail_now(self) -> tuple[int, str]:
        if self._tail is None:
            self._tail = head(self.connection)
        return self._tail


def insert_many(connection: Connection, table: Table, rows: Sequence[Mapping[str, Any]]) -> None:
    """Rows with the same columns."""
    insert_columns(connection, table, {name: [row[name] for row in rows] for name in rows[0]})


def insert_columns(connection: Connection, table: Table, columns: Columns) -> None:
    """Rows given by column."""
    if connection.dialect.name == "sqlite":
        _insert_sqlite(connection, table, columns)
        return
    rows = [dict(zip(columns, row, strict=True)) for row in zip(*columns.values(), strict=True)]
    connection.execute(insert(table), rows)


def _insert_sqlite(connection: Connection, table: Table, columns: Columns) -> None:
    """Many rows in one statement, straight to the driver: SQLAlchemy's own way costs a bulk import more than the
    database itself does, and a statement for each row half as much again.
    """
    known = {name: values for name, values in columns.items() if values.count(None) < len(values)}
    values = [_driver_values(table.c[name], column, connection.dialect) for name, column in known.items()]
    names = ", ".join(map(connection.dialect.identifier_preparer.quote, known))
    row, width = f"({', '.join('?' * len(known))})", len(known)
    flat = tuple(chain.from_iterable(zip(*values, strict=True)))
    blocks = [flat[at : at + ROWS_AT_ONCE * width] for at in range(0, len(flat), ROWS_AT_ONCE * width)]
    rest = [blocks.pop()] if len(blocks[-1]) < ROWS_AT_ONCE * width else []
    for some in filter(None, (blocks, rest)):
        rows = ", ".join([row] * (len(some[0]) // width))
        connection.exec_driver_sql(f"INSERT INTO {table.name} ({names}) VALUES {rows}", some)  # noqa: S608


def _driver_values(column: Column[Any], values: Sequence[Any], dialect: Dialect) -> Sequence[Any]:
    turned = column.type.dialect_impl(dialect).bind_processor(dialect)
    return list(map(turned, values)) if turned else values


def head(connection: Connection) -> tuple[int, str]:
    """The number and hash of the newest entry: together they name the state of the record."""
    table = schema.journal
    newest = select(table.c.seq, table.c.hash).order_by(table.c.seq.desc()).limit(1)
    row = connection.execute(newest).first()
    return (row.seq, row.hash) if row else (0, FIRST_HASH)


def entry_hash(row: Mapping[str, Any]) -> str:
    hashed = hasher(row["at"], row["who"], row["action"], row["sheet"], row["reason"])
    return hashed(row["seq"], row["row_id"], row["change"], row["previous_hash"])


def hasher(at: datetime, who: str, action: str, sheet: str, reason: str) -> Callable[[int, int, str, str], str]:
    """SHA-256 over every column but the hash itself, as a JSON list that has one spelling only; what many entries
    share is spelled once.
    """
    origin = ",".join(map(_SPELLED.encode, (schema.fixed_width(at), who, action, sheet)))
    why = _SPELLED.encode(reason)

    def hashed(seq: int, row_id: int, change: str, previous: str) -> str:
        spelled = f"[{seq},{origin},{row_id},{why},{_SPELLED.encode(change)},{_SPELLED.encode(previous)}]"
        return hashlib.sha256(spelled.encode()).hexdigest()

    return hashed


def canonical(change: Mapping[str, Any]) -> str:
    return _CANONICAL.encode(change)


def _plain(value: object) -> str:
    if isinstance(value, datetime):
        return schema.fixed_width(value)
    if isinstance(value, date):
        return value.isoformat()
    raise TypeError(f"{type(value).__name__} has no place in the journal")


_SPELLED = json.JSONEncoder()
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
