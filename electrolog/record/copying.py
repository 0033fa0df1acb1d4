"""A whole record from one database into another, on whatever engines, and the proof that the two are equal."""

from __future__ import annotations

import hashlib
import os
import shutil
import sqlite3
import time
from collections.abc import Iterator
from contextlib import closing, contextmanager, suppress
from pathlib import Path

from sqlalchemy import Connection, Table, select

from electrolog.errors import RecordError
from electrolog.record import journal, migrate, schema, store
from electrolog.record.sheets import SHEETS
from electrolog.record.store import Record
from electrolog.record.translate import translated

Fingerprint = dict[str, tuple[int, str]]
LEFT_BEHIND_S = 6 * 3600.0
_MANY = 5000
_PART = ".electrolog-part"
_BESIDE = ("", "-wal", "-shm", "-journal")


def tables() -> list[Table]:
    """In an order in which every link points backwards: a struck row points at its journal entry."""
    recorded = [schema.journal, *(schema.tables[sheet.name] for sheet in SHEETS)]
    return [*recorded, *(table for table in schema.metadata.tables.values() if table not in recorded)]


def fingerprint(connection: Connection) -> Fingerprint:
    """Per table how many rows it has, and SHA-256 over all of them in the order of their keys."""
    return {table.name: _fingerprint(connection, table) for table in tables()}


def _fingerprint(connection: Connection, table: Table) -> tuple[int, str]:
    count, digest = 0, hashlib.sha256()
    for rows in _rows(connection, table):
        count += len(rows)
        for row in rows:
            digest.update(journal.canonical(row).encode() + b"\n")
    return count, digest.hexdigest()


def _rows(connection: Connection, table: Table) -> Iterator[list[dict[str, object]]]:
    key = list(table.primary_key) or [table.c.calibration_id, table.c.ordinal]
    query = select(table).order_by(*key).execution_options(yield_per=_MANY)
    for some in connection.execute(query).mappings().partitions():
        yield [dict(row) for row in some]


def copy_rows(source: Connection, target: Record) -> None:
    """Every row as it stands, into a database that holds none. Raises RecordError unless the two are then equal."""
    migrate.make_tables(target)
    writing = target.engine.execution_options(electrolog_writes=True)
    with translated(target.name), writing.begin() as connection:
        for table in tables():
            for rows in _rows(source, table):
                journal.insert_many(connection, table, rows)
        refuse_unequal(fingerprint(source), fingerprint(connection), target.name)


def refuse_unequal(source: Fingerprint, copy: Fingerprint, name: str) -> None:
    differing = [table for table in source if source[table] != copy.get(table)]
    if differing:
        raise RecordError(f"the copy in {name} is not equal ({', '.join(differing)}); it was given up")


def copy_file(source: Path, target: Path) -> None:
    """A file's every page, one state of it while others write, checked after writing; `target` may be in use.

    A new one may be read and written by whom its source may: a lab that closed its record closed its copies too.
    """
    make_as_closed(source, target)
    with (
        translated(str(source)),
        closing(sqlite3.connect(source, timeout=store.BUSY_TIMEOUT_MS / 1000)) as old,
        closing(sqlite3.connect(target, timeout=store.BUSY_TIMEOUT_MS / 1000)) as new,
    ):
        old.backup(new)
        if new.execute("PRAGMA integrity_check").fetchone() != ("ok",):
            raise RecordError(f"the copy {target} is not whole; {source} was left as it was")


def make_as_closed(source: Path, target: Path) -> None:
    """An empty file, if nothing is there yet, for those who may use `source` and nobody else."""
    if target.exists():
        return
    try:
        target.touch(mode=0o600)
        shutil.copymode(source, target)
    except OSError as why:
        raise RecordError(f"{target} can't be written: {why.strerror}", "look whether its folder is there") from None


@contextmanager
def written_whole(target: Path) -> Iterator[Path]:
    """A place beside `target`; what was written there gets its name at the very end, or is gone."""
    with written_beside(target) as part:
        yield part
        finish(part, target)


@contextmanager
def written_beside(target: Path) -> Iterator[Path]:
    """A place beside `target` that is gone afterwards, unless finish() gave it its name.

    What somebody who was killed left there is taken away by the next who writes.
    """
    _sweep(target.parent)
    part = target.with_name(f".{target.name}.{os.getpid()}{_PART}")
    try:
        yield part
    finally:
        for end in _BESIDE:
            part.with_name(part.name + end).unlink(missing_ok=True)


def finish(part: Path, target: Path) -> Path:
    _make_single_file(part)
    return part.replace(target)


def _sweep(folder: Path) -> None:
    """Only what nobody has touched for long: another who writes there, on whatever machine, goes on."""
    for left in folder.glob(f".*{_PART}*"):
        with suppress(OSError):  # another swept it at the same time, or Windows has it open
            if left.name.endswith(tuple(_PART + end for end in _BESIDE)) and _idle_s(left) > LEFT_BEHIND_S:
                left.unlink()


def _idle_s(path: Path) -> float:
    return time.time() - path.stat().st_mtime


def _make_single_file(path: Path) -> None:
    """No write-ahead log beside it: a file that can be carried off alone, and read where nothing may be written."""
    with closing(sqlite3.connect(path)) as connection:
        connection.execute("PRAGMA journal_mode = DELETE")
