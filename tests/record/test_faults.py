"""What goes wrong around a record: said in words, with an exit status, and nothing that was acknowledged is lost."""

from __future__ import annotations

import os
import shutil
import subprocess
import sys
import tempfile
from collections.abc import Callable, Iterator
from pathlib import Path
from typing import Any

import pytest
from sqlalchemy import create_engine, text

from electrolog.errors import RecordError
from electrolog.lab import Lab, open_lab, set_up
from electrolog.record import entry, place, sheets

Raw = Callable[..., list[Any]]
MAIN = "from electrolog.cli.main import main; sys.exit(main(sys.argv[1:]))"
POSIX = pytest.mark.skipif(sys.platform == "win32", reason="tried by POSIX's own means")
LINUX = pytest.mark.skipif(not sys.platform.startswith("linux"), reason="tried by Linux's own means")


def electrolog(before: str, *arguments: str, **environment: str) -> subprocess.CompletedProcess[str]:
    """A process of its own, after the statements `before`."""
    return subprocess.run(
        [sys.executable, "-c", f"import sys, os; {before}; {MAIN}", *arguments],
        check=False,
        capture_output=True,
        encoding="utf-8",
        env=os.environ | environment,
        cwd=Path(__file__).resolve().parents[2],
        timeout=120,
    )


def assert_said(done: subprocess.CompletedProcess[str], said: str) -> None:
    assert (done.returncode, done.stdout) == (1, ""), done.stderr
    assert said in done.stderr
    assert done.stderr.count("\n") == 1


@pytest.fixture
def file(empty_file: Path, tmp_path: Path) -> Path:
    return Path(shutil.copy(empty_file, tmp_path / "record.db"))


@pytest.fixture
def open_folder(empty_file: Path) -> Iterator[Path]:
    """One that another user may enter: the tests' own folders are closed."""
    with tempfile.TemporaryDirectory() as name:
        folder = Path(name)
        folder.chmod(0o755)
        shutil.copy(empty_file, folder / "record.db")
        yield folder


# --- disk and folder ---------------------------------------------------------------------------------------------


@POSIX
@pytest.mark.parametrize("room_left", [0, 3000, 9000])
def test_a_full_disk_is_said_and_costs_nothing(file: Path, room_left: int) -> None:
    lab = open_lab(str(file))
    lab.make_probes(["BEFORE"])
    before = lab.verify()
    most = Path(f"{file}-wal").stat().st_size + room_left if Path(f"{file}-wal").exists() else room_left
    limit = (
        "import resource, signal; signal.signal(signal.SIGXFSZ, signal.SIG_IGN);"
        f" resource.setrlimit(resource.RLIMIT_FSIZE, ({most}, {most}))"
    )
    labels = [f"P-{number}" for number in range(400)]
    done = electrolog(limit, "--db", str(file), "new", *labels)
    assert done.returncode == 1
    assert "Traceback" not in done.stderr
    assert "disk" in done.stderr
    assert lab.verify() == before
    assert lab.make_probes(["AFTER"]) == ["AFTER"]


def as_somebody_else() -> str:
    """The superuser is refused nothing; whom it becomes may not read the program, so that is loaded first."""
    if os.geteuid() != 0:
        return "pass"
    return "from tests.faults.zygote import load_everything; load_everything(); os.setuid(65534)"


@POSIX
@pytest.mark.parametrize("closed", ["file", "folder"])
def test_where_nothing_may_be_written_it_is_said(open_folder: Path, closed: str) -> None:
    file = open_folder / "record.db"
    for path in (file, *([open_folder] if closed == "folder" else [])):
        path.chmod(path.stat().st_mode & ~0o222)
    done = electrolog(as_somebody_else(), "--db", str(file), "new", "P1")
    open_folder.chmod(0o755)
    assert_said(done, "may not be written")
    assert open_lab(str(file)).verify().whole


@POSIX
def test_a_file_taken_away_is_missed_at_once(file: Path, tmp_path: Path) -> None:
    """Whoever had it open could write on into a file that has no name any more."""
    folder = tmp_path / "lab"
    folder.mkdir()
    file = file.rename(folder / "record.db")
    lab = open_lab(str(file))
    lab.make_probes(["BEFORE"])
    folder.rename(tmp_path / "moved")
    for ask in (lambda: lab.make_probes(["LOST"]), lambda: lab.rows("electrodes")):
        with pytest.raises(RecordError, match="is gone"):
            ask()
    (tmp_path / "moved").rename(folder)
    assert lab.make_probes(["AFTER"]) == ["AFTER"]
    assert lab.verify().whole


@POSIX
def test_a_file_put_in_its_place_is_the_one_that_is_written(file: Path, tmp_path: Path) -> None:
    lab = open_lab(str(file))
    lab.make_probes(["OLD"])
    other = lab.back_up(tmp_path / "kept").path
    open_lab(str(other)).make_probes(["OTHER"])
    for end in ("-wal", "-shm"):
        Path(f"{file}{end}").unlink(missing_ok=True)
    other.replace(file)
    lab.make_probes(["NEW"])
    assert {row["electrode"] for row in open_lab(str(file)).rows("electrodes")} == {"OLD", "OTHER", "NEW"}
    assert lab.verify().whole


@POSIX
def test_a_file_that_everybody_may_write_is_refused(file: Path) -> None:
    file.chmod(0o666)
    for door in (open_lab, set_up):
        with pytest.raises(RecordError, match="written by everybody") as refused:
            door(str(file))
        assert "chmod o-w" in refused.value.hint
    file.chmod(0o660)  # a group is the lab's own business
    assert open_lab(str(file)).verify().whole


# --- locks -------------------------------------------------------------------------------------------------------

MOUNTS = """\
/dev/disk1 / ext4 rw 0 0
server:/lab /mnt/lab nfs4 rw,vers=4.2 0 0
//server/rigs /mnt/two\\040words cifs rw 0 0
tmpfs /mnt/lab/fast tmpfs rw 0 0
"""


@POSIX
@pytest.mark.parametrize(
    ("path", "kind"),
    [
        ("/etc/lab.db", "ext4"),
        ("/mnt/lab/lab.db", "nfs4"),
        ("/mnt/laboratory/lab.db", "ext4"),
        ("/mnt/lab/fast/lab.db", "tmpfs"),
        ("/mnt/two words/deep/lab.db", "cifs"),
    ],
)
def test_the_kind_of_a_mount_is_read(path: str, kind: str) -> None:
    assert place.kind_of_mount(Path(path), MOUNTS) == kind


@LINUX
def test_a_network_share_is_refused(file: Path, monkeypatch: pytest.MonkeyPatch, tmp_path: Path) -> None:
    mounts = tmp_path / "mounts"
    mounts.write_text(f"/dev/disk1 / ext4 rw 0 0\nserver:/lab {file.parent} nfs4 rw 0 0\n", encoding="utf-8")
    monkeypatch.setattr(place, "_MOUNTS", mounts)
    with pytest.raises(RecordError, match="network share") as refused:
        open_lab(str(file))
    assert "electrolog move" in refused.value.hint


NO_LOCKS = """
#include <errno.h>
#include <fcntl.h>
int fcntl(int fd, int command, ...) __attribute__((alias("locks")));
int fcntl64(int fd, int command, ...) __attribute__((alias("locks")));
#include <stdarg.h>
#include <sys/syscall.h>
#include <unistd.h>
int locks(int fd, int command, ...) {
    va_list rest; va_start(rest, command); void *argument = va_arg(rest, void *); va_end(rest);
    if (command == F_SETLK || command == F_SETLKW || command == F_GETLK) {
        if (GIVES) { if (command == F_GETLK) ((struct flock *)argument)->l_type = F_UNLCK; return 0; }
        errno = ENOLCK; return -1;
    }
    return syscall(SYS_fcntl, fd, command, argument);
}
"""


@LINUX
@pytest.mark.parametrize(("gives", "said"), [("1", "the same lock to two at once"), ("0", "gives no locks")])
def test_a_file_system_without_working_locks_is_refused(tmp_path: Path, gives: str, said: str) -> None:
    """A file system that grants every lock, or none: what the C library says of locks is replaced."""
    compiler = shutil.which("cc")
    if compiler is None:
        pytest.skip("no C compiler to make such a file system's answers with")
    source, library = tmp_path / "locks.c", tmp_path / "locks.so"
    source.write_text(NO_LOCKS, encoding="utf-8")
    built = [compiler, "-shared", "-fPIC", f"-DGIVES={gives}", "-o", str(library), str(source)]
    subprocess.run(built, check=True, capture_output=True)
    done = electrolog("pass", "--db", str(tmp_path / "lab" / "record.db"), "setup", LD_PRELOAD=str(library))
    assert_said(done, said)
    assert list((tmp_path / "lab").iterdir()) == []


# --- clock and server ---------------------------------------------------------------------------------------------


def test_a_clock_that_jumps_back_breaks_nothing(lived_in: Lab, monkeypatch: pytest.MonkeyPatch) -> None:
    for number, now in enumerate(("2026-05-01T00:00:00Z", "2026-04-01T00:00:00Z", "2026-04-30T23:59:59.5Z")):
        monkeypatch.setenv("ELECTROLOG_NOW", now)
        lived_in.make_probes([f"P-{number}"])
        lived_in.amend("exposure", "1", {"duration_min": str(100 + number)}, "once more")
    assert lived_in.verify().whole
    entries = lived_in.journal()
    assert [one.seq for one in entries] == list(range(1, len(entries) + 1))
    ((_, changed),) = lived_in.amend("exposure", "1", {"duration_min": "50"}, "last").changes.values()
    assert changed == 50


def cut_off(lab: Lab) -> None:
    """As an administrator would, or a server that restarts."""
    engine = create_engine(lab.record.engine.url)
    with engine.connect() as connection:
        connection.execute(
            text(
                "SELECT pg_terminate_backend(pid) FROM pg_stat_activity"
                " WHERE datname = current_database() AND pid <> pg_backend_pid()"
            )
        )
    engine.dispose()


@pytest.mark.parametrize("after", ["nothing", "rows"])
def test_a_server_cut_off_in_the_middle_is_said_and_nothing_is_half(lived_in: Lab, after: str) -> None:
    if lived_in.record.is_file:
        pytest.skip("a server's own matter")
    before = lived_in.verify()

    def interrupted() -> None:
        with lived_in.record.writing() as writer:
            entry.add(writer, sheets.ELECTRODES, {"electrode": "HALF"})
            if after == "rows":
                writer.flush()
            cut_off(lived_in)

    with pytest.raises(RecordError, match="was cut off") as refused:
        interrupted()
    assert "electrolog journal" in refused.value.hint
    assert lived_in.verify() == before
    assert lived_in.make_probes(["AFTER"]) == ["AFTER"]
