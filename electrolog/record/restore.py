"""Bringing a backup back, and moving a record: never over what holds more, unless that was asked for."""

from __future__ import annotations

from dataclasses import dataclass
from pathlib import Path

from sqlalchemy import Connection, select

from electrolog.clock import utc_now
from electrolog.errors import InputError, RecordError, TamperedRecord
from electrolog.record import backup, copying, journal, migrate, schema, store
from electrolog.record.store import Record
from electrolog.record.verify import Verification, verify

EMPTY, SAME, OLDER, NEWER, ANOTHER, UNREADABLE = "empty", "same", "older", "newer", "another", "unreadable"


@dataclass(frozen=True)
class Restored:
    """found: what stood there before, `older` and so on; set_aside: where that is kept."""

    where: str
    entries: int
    head: str
    found: str
    set_aside: Path | None = None


@dataclass(frozen=True)
class Moved:
    source: str
    target: str
    entries: int
    head: str
    rows: dict[str, int]


def restore(where: str, file: Path, replace: bool = False) -> Restored:
    """Puts the backup `file` in the place `where`. What stood there is kept beside it.

    Raises RecordError where that holds entries the backup doesn't, unless `replace`; TamperedRecord for a backup
    whose rows are not what its journal says.
    """
    target = store.connected(where)
    if target.is_file and Path(target.name).resolve() == file.resolve():
        raise InputError("the backup and the record are the same file; accepted: two places")
    store.refuse_unsafe(target)
    whole = _whole_backup(file)
    found = _standing(target, file)
    if found == SAME:
        return Restored(target.name, whole.entries, whole.head, found)
    _refuse_loss(target, file, found, replace)
    aside = _set_aside(target, found)
    _put_in_place(target, file)
    return Restored(target.name, whole.entries, whole.head, found, aside)


def move(source: Record, where: str) -> Moved:
    """Copies the whole record into an empty place; nobody writes meanwhile. The old one stays as it was.

    Raises RecordError unless both prove equal: journal head, every row, and each journal replayed.
    """
    target = store.connected(where)
    store.refuse_unsafe(target)
    with source.writing(), source.reading() as connection:
        if _state(target) != EMPTY:
            raise RecordError(f"{target.name} holds a record already", "name an empty place")
        _fill(source, connection, target)
        with target.reading() as copy:
            found, copied = verify(connection), verify(copy)
            rows = copying.fingerprint(copy)
            copying.refuse_unequal(copying.fingerprint(connection), rows, target.name)
    if copied != found:
        raise RecordError(f"{target.name} does not prove equal to {source.name}; go on with the old one")
    return Moved(
        source.name, target.name, found.entries, found.head, {name: count for name, (count, _) in rows.items()}
    )


def _whole_backup(file: Path) -> Verification:
    if not file.is_file():
        raise InputError(f"there is no file {file}; accepted: a backup that `electrolog backup` wrote")
    found = backup.checked(file)
    if not found.whole:
        raise TamperedRecord(
            f"{file} is not what its journal says ({len(found.faults)} faults; first: {found.faults[0]})",
            "take another backup",
        )
    return found


def _state(record: Record) -> str:
    """What stands at a place: `empty`, `unreadable`, or `another` for a record that is yet to be looked at."""
    if record.is_file and not Path(record.name).exists():
        return EMPTY
    try:
        if store.revision_of(record) is None:
            return EMPTY
        with record.reading() as connection:
            return ANOTHER if journal.head(connection)[0] else EMPTY
    except RecordError:
        if record.is_file and Path(record.name).is_file():
            return UNREADABLE
        raise


def _standing(target: Record, file: Path) -> str:
    state = _state(target)
    if state != ANOTHER:
        return state
    try:
        with target.reading() as there, store.connected(str(file)).reading() as saved:
            return _compared(there, saved)
    except RecordError:
        return UNREADABLE


def _compared(there: Connection, saved: Connection) -> str:
    head_there, head_saved = journal.head(there), journal.head(saved)
    if head_there == head_saved:
        return SAME
    if _holds(saved, head_there):
        return OLDER
    return NEWER if _holds(there, head_saved) else ANOTHER


def _holds(connection: Connection, head: tuple[int, str]) -> bool:
    seq, found = head
    query = select(schema.journal.c.hash).where(schema.journal.c.seq == seq)
    return connection.execute(query).scalar() == found


def _refuse_loss(target: Record, file: Path, found: str, replace: bool) -> None:
    if found in (EMPTY, OLDER) and (target.is_file or found == EMPTY):
        return
    if not target.is_file:
        raise RecordError(f"{target.name} holds a record already", "restore into an empty database, and name that one")
    said = {
        NEWER: f"{target.name} holds newer entries, which the backup {file} does not",
        ANOTHER: f"{target.name} and the backup {file} have gone different ways: each holds what the other does not",
        UNREADABLE: f"{target.name} can't be read, so that nobody knows what would be lost",
    }
    if not replace:
        raise RecordError(said[found], "--replace puts the backup there all the same; what is there is kept beside it")


def _set_aside(target: Record, found: str) -> Path | None:
    if found == EMPTY:
        return None
    source = Path(target.name)
    aside = source.with_name(f"{source.name}.{utc_now().strftime('%Y%m%dT%H%M%S%f')}.replaced")
    target.engine.dispose()
    if found != UNREADABLE:
        copying.copy_file(source, aside)
        return aside
    for end in ("", "-wal", "-shm"):  # its log belongs to it and would be played into the backup
        if (part := source.with_name(source.name + end)).exists():
            part.rename(aside.with_name(aside.name + end))
    return aside


def _put_in_place(target: Record, file: Path) -> None:
    """Into a file that others have open it goes as one transaction, so that each sees the old record or the new."""
    if not target.is_file:
        with store.connected(str(file)).reading() as connection:
            copying.copy_rows(connection, target)
    elif Path(target.name).exists():
        copying.copy_file(file, Path(target.name))
    else:
        store.make_folder(target)
        with copying.written_whole(Path(target.name)) as part:
            copying.copy_file(file, part)
        migrate.write_ahead(target)


def _fill(source: Record, rows: Connection, target: Record) -> None:
    if not target.is_file:
        copying.copy_rows(rows, target)
        return
    store.make_folder(target)
    with copying.written_whole(Path(target.name)) as part:
        if source.is_file:
            copying.make_as_closed(Path(source.name), part)
        copying.copy_rows(rows, store.connected(str(part)))
    migrate.write_ahead(target)
