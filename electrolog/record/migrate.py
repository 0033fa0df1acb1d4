"""Making a database and bringing an older one up, by Alembic. The only room that loads it, and only when needed."""

from __future__ import annotations

import shutil
import sqlite3
from collections.abc import Iterator
from contextlib import closing, contextmanager
from pathlib import Path
from typing import TYPE_CHECKING

from sqlalchemy import Connection

from electrolog.clock import utc_now
from electrolog.errors import RecordError
from electrolog.record import schema

if TYPE_CHECKING:
    from alembic.config import Config

    from electrolog.record.store import Record


MIGRATING = 0x656C6563  # any number that all who migrate agree on


def create(record: Record) -> None:
    """An empty record with the trade's analytes and waveforms in it."""
    from electrolog.record import builtin

    make_tables(record)
    builtin.add_all(record)


def make_tables(record: Record) -> None:
    write_ahead(record)
    to_revision(record, schema.REVISION)


def write_ahead(record: Record) -> None:
    """In a file readers then block nobody, and nobody blocks them; it stays so once it is set."""
    if record.is_file:
        with closing(sqlite3.connect(record.name)) as connection:
            connection.execute("PRAGMA journal_mode = WAL")


def set_up(where: str) -> tuple[Record, str, str, Path | None]:
    """Makes a record at `where`, or brings an older one up; says which, the revision, and the copy made first."""
    from electrolog.record import store

    record = store.connected(where)
    store.refuse_unsafe(record)
    if record.is_file and not Path(record.name).exists():
        store.make_folder(record)
    found = store.revision_of(record)
    if found is None:
        create(record)
        return record, "made", schema.REVISION, None
    if found == schema.REVISION:
        return record, "up to date already", found, None
    store.refuse_newer(record, found)
    return record, f"brought up from revision {found}", schema.REVISION, upgrade(record)


def upgrade(record: Record) -> Path | None:
    """Brings an older record up to date; returns the copy that was made first (SQLite).

    Raises RecordError, which names the copy; the record is then as it was, since a migration is one transaction.
    """
    copy = copy_of_file(record) if record.is_file else None
    try:
        to_revision(record, schema.REVISION)
    except RecordError as why:
        kept = f"and the copy from before is {copy}" if copy else "and only the database's owner can upgrade it"
        hint = f"the record is as it was, {kept}"
        raise RecordError(f"the upgrade stopped: {why.message}", hint) from None
    return copy


def copy_of_file(record: Record) -> Path:
    """A whole copy beside the file, named by the moment, checked after writing."""
    from electrolog.record.copying import copy_file, written_whole

    source = Path(record.name)
    target = source.with_name(f"{source.name}.{utc_now().strftime('%Y%m%dT%H%M%S%f')}.copy")
    if shutil.disk_usage(source.parent).free < 2 * source.stat().st_size:
        raise RecordError(f"no room for a copy of {source} before its upgrade", "make room on that disk first")
    with written_whole(target) as part:
        copy_file(source, part)
    return target


def to_revision(record: Record, revision: str) -> None:
    """Runs the migrations from where the database stands to `revision`, up or down, in one transaction."""
    from alembic import command
    from alembic.script import ScriptDirectory

    config = _config()
    script = ScriptDirectory.from_config(config)
    with _migrating(record) as connection:
        config.attributes["connection"] = connection
        now = connection.exec_driver_sql(
            "SELECT version_num FROM alembic_version" if _has_version(connection) else "SELECT NULL"
        ).scalar()
        known = [step.revision for step in reversed(list(script.walk_revisions()))]
        if now is not None and now not in known:
            raise RecordError(f"{record.name} is of revision '{now}', which this electrolog has never had")
        order = ["base", *known]
        if order.index(revision) >= order.index(now or "base"):
            command.upgrade(config, revision)
        else:
            command.downgrade(config, revision)


def _has_version(connection: Connection) -> bool:
    return connection.dialect.has_table(connection, "alembic_version")


def newest_revision() -> str | None:
    from alembic.script import ScriptDirectory

    return ScriptDirectory.from_config(_config()).get_current_head()


def _config() -> Config:
    from alembic.config import Config

    config = Config()
    config.set_main_option("script_location", str(migrations_folder()))
    config.set_main_option("path_separator", "os")
    return config


def migrations_folder() -> Path:
    """Beside the package in a checkout, inside it in an installed wheel."""
    package = Path(__file__).resolve().parents[1]
    inside = package / "migrations"
    return inside if inside.is_dir() else package.parent / "migrations"


@contextmanager
def _migrating(record: Record) -> Iterator[Connection]:
    """A connection with foreign keys off: rebuilding a parent table with them on would empty its children.

    The pragma does nothing inside a transaction, so it stands before BEGIN; every key is checked before COMMIT.
    """
    from electrolog.record.translate import translated

    with translated(record.name), record.engine.connect().execution_options(electrolog_writes=True) as connection:
        if record.is_file:
            connection.detach()  # never back to the pool: whoever got it next would write with foreign keys off
            connection.connection.dbapi_connection.execute("PRAGMA foreign_keys = OFF")  # type: ignore[union-attr]
        with connection.begin():
            if not record.is_file:  # two that migrate at once would both make the same tables
                connection.exec_driver_sql(f"SELECT pg_advisory_xact_lock({MIGRATING})")
            yield connection
            if record.is_file:
                broken = connection.exec_driver_sql("PRAGMA foreign_key_check").all()
                if broken:
                    raise RecordError(f"the migration would break {len(broken)} links; nothing was changed")
