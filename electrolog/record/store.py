"""Opening the database: where it is, one short write transaction per event, readers that block nobody."""

from __future__ import annotations

import getpass
import logging
import os
import random
import sqlite3
import time
import weakref
from collections.abc import Iterator
from contextlib import contextmanager
from functools import cached_property
from pathlib import Path
from typing import Any

from sqlalchemy import Connection, Engine, create_engine, event, select, text
from sqlalchemy.engine import URL
from sqlalchemy.exc import ArgumentError, OperationalError
from sqlalchemy.pool import NullPool, QueuePool

from electrolog.errors import InputError, RecordError, shortened
from electrolog.record import journal, place, schema
from electrolog.record.translate import translated
from electrolog.record.url import database_url

__all__ = ["Connection", "Record", "open_record"]

BUSY_TIMEOUT_MS = 60_000
CACHE_KB = (
    64_000  # SQLite's own 2 MB is read and written over and over by a large import; what isn't needed isn't taken
)
BETWEEN_LOOKS_S = (0.002, 0.02)
WRITING = 0x656C6570  # any number that all who write agree on
_SECRETS = ("password", "passfile", "sslpassword")  # what a URL may hold beside the password in its usual place
LEAST_SQLITE = (3, 37, 0)  # STRICT tables


class Record:
    """One database. Build it with open_record()."""

    def __init__(self, engine: Engine, who: str | None) -> None:
        self.engine = engine
        weakref.finalize(self, engine.dispose)  # a connection left open would keep the file in use on Windows
        self._named = who
        self._opened: tuple[int, int] | None = None
        self.read_only = False

    @cached_property
    def who(self) -> str:
        """The database's login on a server, which the client can't choose; in a file the machine's user."""
        if self._named is not None:
            return self._named
        if self.is_file:
            return current_user()
        with self.reading() as connection:
            return str(connection.execute(text("SELECT session_user")).scalar_one())

    @property
    def name(self) -> str:
        """What to call the database in a message: never with a password in it."""
        url = self.engine.url.difference_update_query(_SECRETS)
        return url.database or "" if self.is_file else url.render_as_string(True)

    @property
    def is_file(self) -> bool:
        return self.engine.dialect.name == "sqlite"

    @contextmanager
    def reading(self) -> Iterator[Connection]:
        """One state of the record, whatever others write meanwhile."""
        engine = self.engine if self.is_file else self.engine.execution_options(isolation_level="REPEATABLE READ")
        self._refuse_gone()
        with translated(self.name), engine.connect() as connection, connection.begin():
            yield connection

    @contextmanager
    def writing(self, reason: str = "") -> Iterator[journal.Writer]:
        """One transaction: the rows and their journal entries are both there, or neither is."""
        with self.changing() as connection:
            writer = journal.Writer(connection, self.who, reason)
            yield writer
            writer.flush()

    @contextmanager
    def changing(self) -> Iterator[Connection]:
        """One transaction, and no other's meanwhile."""
        if self.read_only:
            raise RecordError(f"{self.name} was opened to be read only", "open it with write=True")
        engine = self.engine.execution_options(electrolog_writes=True)
        self._refuse_gone()
        with translated(self.name), engine.begin() as connection:
            if not self.is_file:
                # A lock of the table would need the right to change it, which nobody has who only adds to it.
                connection.execute(text(f"SET LOCAL lock_timeout = {10 * BUSY_TIMEOUT_MS}"))  # of many, each in turn
                connection.execute(text(f"SELECT pg_advisory_xact_lock({WRITING})"))
            yield connection

    def _refuse_gone(self) -> None:
        """A file that was removed or replaced lives on for whoever has it open, and what is written there is lost."""
        if not self.is_file:
            return
        try:
            found = Path(self.name).stat()
        except OSError:
            raise RecordError(
                f"{self.name} is gone", "look whether its folder was moved or its disk taken out"
            ) from None
        if self._opened != (found.st_dev, found.st_ino):
            self.engine.dispose()
            self._opened = found.st_dev, found.st_ino

    @property
    def may_keep(self) -> bool:
        """Whether what was worked out may be kept for the next who asks: a login that only reads may not."""
        if self.read_only:
            return False
        if self.is_file:
            return os.access(self.name, os.W_OK)
        allowed = text("SELECT has_table_privilege('kept_fits', 'INSERT, DELETE')")
        with self.reading() as connection:
            return bool(connection.execute(allowed).scalar())


def open_record(where: str, who: str | None = None, create: bool = False) -> Record:
    """The record at `where`: a file's path or an SQLAlchemy URL.

    With `create` a database that isn't there yet is made; without, it is an error. Raises RecordError for a
    database that can't be used (absent, damaged, of another version), InputError for a URL that can't be read.
    """
    record = connected(where, who)
    refuse_unsafe(record)
    if record.is_file and not Path(record.name).exists():
        if not create:
            raise RecordError(
                f"there is no record at {record.name}",
                "make one with `electrolog setup`, or name another with --db or ELECTROLOG_DB",
            )
        make_folder(record)
    _bring_to_revision(record, create)
    return record


def connected(where: str, who: str | None = None) -> Record:
    """The record at `where`, not yet looked at."""
    return Record(_engine(database_url(where)), who)


def default_location() -> str:
    """ELECTROLOG_DB, or a file in the folder where this platform keeps a program's data."""
    named = os.environ.get("ELECTROLOG_DB")
    if named:
        return named
    import platformdirs

    return str(platformdirs.user_data_path("electrolog", appauthor=False) / "record.db")


def current_user() -> str:
    try:
        return getpass.getuser()
    except (KeyError, OSError):  # an account without a name, as in some containers
        return "unknown"


def _engine(url: URL) -> Engine:
    try:
        # Opening a file anew costs more than a question does; a server's connections aren't ours to keep.
        engine = create_engine(url, poolclass=QueuePool if url.get_backend_name() == "sqlite" else NullPool)
    except ModuleNotFoundError as missing:
        raise RecordError(
            f"the driver for {url.drivername} is not installed ({missing})",
            "install it with: python -m pip install 'psycopg[binary]'",
        ) from None
    except ArgumentError as why:  # such as a port that is no number, among the options
        raise InputError(
            f"the database's URL can't be read ({shortened(str(why))}); accepted: such as postgresql+psycopg://host/name"
        ) from None
    if engine.dialect.name == "sqlite":
        if sqlite3.sqlite_version_info < LEAST_SQLITE:
            raise RecordError(
                f"this Python carries SQLite {sqlite3.sqlite_version}; 3.37 or newer is needed", "use a newer Python"
            )
        event.listen(engine, "connect", _prepare_sqlite)
        event.listen(engine, "begin", _begin_sqlite)
    elif not (driver := logging.getLogger("psycopg")).handlers:  # of a refused batch it would say more than we do
        driver.addHandler(logging.NullHandler())
    return engine


def _prepare_sqlite(connection: Any, _: object) -> None:
    # The driver's own transactions start too late (at the first write) and leave DDL outside; we say BEGIN.
    connection.isolation_level = None
    cursor = connection.cursor()
    cursor.execute(f"PRAGMA busy_timeout = {BUSY_TIMEOUT_MS}")
    cursor.execute("PRAGMA foreign_keys = ON")
    cursor.execute(f"PRAGMA cache_size = {-CACHE_KB}")
    cursor.close()


def _begin_sqlite(connection: Connection) -> None:
    # A writer takes its lock at once: one that read first and then wrote could be refused in the middle.
    if not connection.get_execution_options().get("electrolog_writes"):
        connection.exec_driver_sql("BEGIN")
        return
    # SQLite's own waiting looks ever more rarely, so that of many who wait the latest comer wins and some never do.
    # Where others get on, a turn will come; it is given up only when for so long nobody has written anything.
    connection.exec_driver_sql("PRAGMA busy_timeout = 0")
    until, version = 0.0, None
    try:
        while True:
            found = connection.exec_driver_sql("PRAGMA data_version").scalar()
            if found != version:
                until, version = time.monotonic() + BUSY_TIMEOUT_MS / 1000, found
            if _began_writing(connection, until):
                return
            time.sleep(random.uniform(*BETWEEN_LOOKS_S))  # noqa: S311 -- no secret
    finally:
        connection.exec_driver_sql(f"PRAGMA busy_timeout = {BUSY_TIMEOUT_MS}")


def _began_writing(connection: Connection, until: float) -> bool:
    try:
        connection.exec_driver_sql("BEGIN IMMEDIATE")
    except OperationalError as error:
        if "is locked" in str(error.orig) and time.monotonic() < until:
            return False
        raise
    return True


def refuse_unsafe(record: Record) -> None:
    if record.is_file:
        place.refuse_unsafe(Path(record.name))


def make_folder(record: Record) -> None:
    """The folder of a record that is yet to be made. Raises RecordError for one that can't hold it."""
    if not record.is_file:
        return
    path = Path(record.name)
    try:
        path.parent.mkdir(parents=True, exist_ok=True)
    except OSError as why:
        raise RecordError(f"the folder {path.parent} can't be made: {why.strerror}") from None
    refuse_unsafe(record)
    place.refuse_lockless(path.resolve().parent)


def _bring_to_revision(record: Record, create: bool) -> None:
    found = revision_of(record)
    if found == schema.REVISION:
        return
    if found is None and not create:
        raise RecordError(f"{record.name} holds no record", "make one there with `electrolog setup`")
    if found is not None:
        refuse_newer(record, found)
        first = "a copy is made first" if record.is_file else "as its owner, and after a backup"
        older = f"{record.name} is of an older version (revision {found}, now {schema.REVISION})"
        raise RecordError(older, f"bring it up with `electrolog setup`; {first}")
    from electrolog.record import migrate

    migrate.create(record)


def refuse_newer(record: Record, found: str) -> None:
    if found > schema.REVISION:
        raise RecordError(
            f"{record.name} was written by a newer electrolog (revision {found}, this one knows {schema.REVISION})",
            "install the newer version",
        )


def revision_of(record: Record) -> str | None:
    """The newest migration the database has seen; None for an empty one. Raises RecordError for one that isn't ours."""
    version = schema.alembic_version
    with translated(record.name), record.engine.connect() as connection:
        tables = set(record.engine.dialect.get_table_names(connection))
        found = connection.execute(select(version.c.version_num)).scalar() if version.name in tables else None
        if schema.journal.name in tables and found is not None:
            return None if _never_finished(connection) else str(found)
        _refuse_foreign(record, tables if found else tables - {version.name})
        return None


def _never_finished(connection: Connection) -> bool:
    """Tables and nothing in them: whoever made the record was interrupted before its first entry."""
    words = schema.tables["analytes"].c.id
    return journal.head(connection)[0] == 0 and connection.execute(select(words).limit(1)).first() is None


def _refuse_foreign(record: Record, tables: set[str]) -> None:
    """A database that holds something else is nobody's empty place to build in."""
    if tables:
        raise RecordError(
            f"{record.name} is a database of something else (it holds the table '{shortened(min(tables))}')",
            "name another place with --db",
        )
