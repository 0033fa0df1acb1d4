"""Backups: one file each, whole, checked, and named by the state of the journal that it holds."""

from __future__ import annotations

import re
from dataclasses import dataclass
from pathlib import Path

from sqlalchemy import select

from electrolog.clock import utc_now
from electrolog.errors import RecordError
from electrolog.record import copying, journal, schema
from electrolog.record.store import Record, connected
from electrolog.record.verify import Verification, verify

_NAME = re.compile(
    r"electrolog-(?P<record>[0-9a-f]{8})-(?P<at>\d{8}T\d{6}Z)-(?P<entries>\d+)-(?P<head>[0-9a-f]{16})\.db"
)


@dataclass(frozen=True)
class Backup:
    """path: the file; made: False where it was there already; removed: what rotation took away."""

    path: Path
    entries: int
    head: str
    made: bool
    removed: tuple[Path, ...]
    faults: tuple[str, ...]


def back_up(record: Record, folder: Path, keep: int | None = None) -> Backup:
    """A checked backup in `folder`, of one state while others write; of a server's record too it is one file.

    With `keep` the oldest of this record beyond that many are removed, but never while the record shows faults:
    the older ones may be the last good ones.
    """
    _make_folder(folder)
    entries, head, identity = _state(record)
    there = _newest_of(folder, identity, entries, head)
    if there is not None and (found := checked(there)).whole:
        return Backup(there, entries, head, False, _rotated(folder, identity, keep, there), ())
    path, found = _written(record, folder, identity)
    removed = _rotated(folder, identity, keep, path) if found.whole else ()
    return Backup(path, found.entries, found.head, True, removed, found.faults)


def checked(path: Path) -> Verification:
    """The backup's journal replayed against its rows. Raises RecordError for a file that can't be read."""
    with connected(str(path)).reading() as connection:
        return verify(connection)


def _make_folder(folder: Path) -> None:
    try:
        folder.mkdir(parents=True, exist_ok=True)
    except OSError as why:
        raise RecordError(f"the folder {folder} can't be made: {why.strerror}") from None


def _state(record: Record) -> tuple[int, str, str]:
    """Entries, head, and what tells this record from any other: the hash of its first entry."""
    first = select(schema.journal.c.hash).where(schema.journal.c.seq == 1)
    with record.reading() as connection:
        return *journal.head(connection), str(connection.execute(first).scalar() or journal.FIRST_HASH)[:8]


def _written(record: Record, folder: Path, identity: str) -> tuple[Path, Verification]:
    """Named at the very end: what it holds is known only once it is written and checked."""
    stem = f"electrolog-{identity}-{utc_now().strftime('%Y%m%dT%H%M%SZ')}"
    with copying.written_beside(folder / stem) as part:
        if record.is_file:
            copying.copy_file(Path(record.name), part)
        else:
            with record.reading() as connection:
                copying.copy_rows(connection, connected(str(part)))
        found = checked(part)
        return copying.finish(part, folder / f"{stem}-{found.entries}-{found.head[:16]}.db"), found


def _newest_of(folder: Path, identity: str, entries: int, head: str) -> Path | None:
    state = (identity, str(entries), head[:16])
    return max(
        (path for path, found in _backups(folder) if found.group("record", "entries", "head") == state), default=None
    )


def _backups(folder: Path) -> list[tuple[Path, re.Match[str]]]:
    return [(path, found) for path in sorted(folder.iterdir()) if (found := _NAME.fullmatch(path.name))]


def _rotated(folder: Path, identity: str, keep: int | None, newest: Path) -> tuple[Path, ...]:
    """`newest` stays whatever its name says: a clock that was set back must not cost the backup just made."""
    if keep is None:
        return ()
    older = [path for path, found in _backups(folder) if found["record"] == identity and path != newest]
    removed = tuple(older[: max(0, len(older) - (keep - 1))])
    for path in removed:
        path.unlink()
    return removed
