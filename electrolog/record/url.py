"""What names a database: a file's path or an SQLAlchemy URL, read before anything is opened."""

from __future__ import annotations

from pathlib import Path

from sqlalchemy.engine import URL, make_url
from sqlalchemy.exc import ArgumentError

from electrolog.errors import InputError, shortened
from electrolog.record.columns import checked_text

LONGEST_NAME = 4096
_DRIVERS = {
    "sqlite": "sqlite",
    "sqlite+pysqlite": "sqlite",
    "postgresql": "postgresql+psycopg",
    "postgresql+psycopg": "postgresql+psycopg",
}


def database_url(where: str) -> URL:
    if not where.strip():
        raise InputError("the database's name is empty; accepted: a file's path or an SQLAlchemy URL")
    checked_text(where, "the database's name", LONGEST_NAME)
    url = _url(where) if "://" in where else URL.create("sqlite", database=str(Path(where).expanduser()))
    if url.drivername not in _DRIVERS:
        raise InputError(
            f"a '{shortened(url.drivername, 30)}' database can't hold the record; accepted: sqlite, postgresql+psycopg"
        )
    url = url.set(drivername=_DRIVERS[url.drivername])
    if url.drivername != "sqlite":
        return url
    if url.database in (None, "", ":memory:"):
        raise InputError("a database in memory would be lost at once; accepted: a file's path")
    if url.query or url.host:
        raise InputError("an SQLite URL takes a file's path and nothing else; accepted: such as sqlite:///lab.db")
    return url


def _url(where: str) -> URL:
    try:
        return make_url(where)
    except (ArgumentError, ValueError):  # ValueError: a port that is no number
        raise InputError("the database's URL can't be read; accepted: such as postgresql+psycopg://host/name") from None
