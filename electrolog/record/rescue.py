"""What can be saved of a damaged file: the journal holds enough to make every row again that it tells of."""

from __future__ import annotations

from dataclasses import dataclass
from datetime import date, datetime
from pathlib import Path
from typing import Any

from sqlalchemy import Connection, Table, select
from sqlalchemy.exc import DBAPIError

from electrolog.errors import InputError, RecordError
from electrolog.record import copying, journal, migrate, schema, store
from electrolog.record.schema import IsoDay, UtcMoment
from electrolog.record.sheets import POINTS, SHEETS, Sheet
from electrolog.record.store import Record
from electrolog.record.verify import Rows, replay


@dataclass(frozen=True)
class Rescued:
    """entries: so many from the first on were whole; stopped: what ended them, empty where it was the end itself."""

    target: str
    entries: int
    head: str
    rows: int
    stopped: str


def rescue(where: str, target: str) -> Rescued:
    """A new record at `target` with all that the damaged one's journal still proves; the damaged one is only read.

    Raises RecordError where not even the first entry can be read, or something is at `target` already.
    """
    source, new = store.connected(where), store.connected(target)
    if not (source.is_file and new.is_file):
        raise InputError("a server's record is brought back by its own means; accepted: files")
    if Path(new.name).exists():
        raise RecordError(f"{new.name} is there already", "name a new file")
    entries, stopped = _proven(source)
    if not entries:
        raise RecordError(f"nothing of {source.name} can be saved ({stopped})", "restore a backup")
    store.make_folder(new)
    with copying.written_whole(Path(new.name)) as part:
        copying.make_as_closed(Path(source.name), part)
        count = _write(store.connected(str(part)), entries)
    migrate.write_ahead(new)
    return Rescued(new.name, len(entries), entries[-1]["hash"], count, stopped)


def _proven(source: Record) -> tuple[list[dict[str, Any]], str]:
    """The journal's entries up to the first that can't be read or does not follow the one before it."""
    entries: list[dict[str, Any]] = []
    previous = journal.FIRST_HASH
    try:
        with source.engine.connect() as connection:
            while (entry := _entry(connection, len(entries) + 1)) is not None:
                if entry["previous_hash"] != previous or journal.entry_hash(entry) != entry["hash"]:
                    return entries, f"entry {entry['seq']} is not what was written"
                previous = entry["hash"]
                entries.append(entry)
            return entries, _beyond(connection, len(entries))
    except (DBAPIError, ValueError, TypeError, AttributeError):  # what a damaged page holds may be of any kind
        return entries, f"the file can't be read beyond entry {len(entries)}"


def _entry(connection: Connection, seq: int) -> dict[str, Any] | None:
    found = connection.execute(select(schema.journal).where(schema.journal.c.seq == seq)).mappings().first()
    return None if found is None else dict(found)


def _beyond(connection: Connection, last: int) -> str:
    newest = journal.head(connection)[0]
    return "" if newest == last else f"entry {last + 1} is missing, of {newest}"


def _write(target: Record, entries: list[dict[str, Any]]) -> int:
    migrate.make_tables(target)
    rows: Rows = {}
    faults: list[str] = []
    for entry in entries:
        replay(rows, entry, faults)
    if faults:
        raise RecordError(f"the journal can't be replayed ({faults[0]})", "restore a backup")
    with target.changing() as connection:
        journal.insert_many(connection, schema.journal, entries)
        for sheet in SHEETS:
            own = [_row(sheet, place, values) for place, values in rows.items() if place[0] == sheet.name]
            if own:
                journal.insert_many(connection, schema.tables[sheet.name], own)
    return len(rows)


def _row(sheet: Sheet, place: tuple[str, int, int], values: dict[str, Any]) -> dict[str, Any]:
    table = schema.tables[sheet.name]
    key = {"ordinal": place[2]} if sheet is POINTS else {"id": place[1]}
    return {column.name: _as_kept(table, column.name, (key | values).get(column.name)) for column in table.columns}


def _as_kept(table: Table, column: str, value: Any) -> Any:
    """The journal holds moments and days as text."""
    kind = table.c[column].type
    if value is None or not isinstance(kind, UtcMoment | IsoDay):
        return value
    return datetime.fromisoformat(value) if isinstance(kind, UtcMoment) else date.fromisoformat(value)
