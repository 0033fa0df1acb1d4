"""A disk that is really full: a small file system in memory, filled up but for a little, and an entry that needs more.

    python tests/faults/full.py 40                   # needs Linux and its superuser, who may mount

Each entry is there as a whole or refused in words, and with room made again everything goes on.
"""

from __future__ import annotations

import errno
import os
import random
import subprocess
import sys
import tempfile
from collections.abc import Iterator
from contextlib import contextmanager
from dataclasses import dataclass, field
from pathlib import Path

from sqlalchemy import create_engine

sys.path.insert(0, str(Path(__file__).resolve().parents[2]))

from electrolog.errors import RecordError
from electrolog.lab import open_lab, set_up
from electrolog.record.verify import Verification
from tests.faults.servers import Server

SQLITE_MB, POSTGRESQL_MB = 4, 160
PROBES = 1500
WORDS = ("no room left", "was cut off", "can't be read or written")


@dataclass
class Outcome:
    """refused: in words that say why; stopped: so often the server itself gave up."""

    tried: int = 0
    refused: int = 0
    stopped: int = 0
    lost: int = 0
    half: int = 0
    broken: list[str] = field(default_factory=list)


def may_mount() -> bool:
    if not sys.platform.startswith("linux"):
        return False
    try:
        with small_disk(1):
            return True
    except (OSError, subprocess.CalledProcessError):
        return False


@contextmanager
def small_disk(megabytes: int) -> Iterator[Path]:
    with tempfile.TemporaryDirectory(prefix="pg", ignore_cleanup_errors=True) as name:
        place = Path(name) / "disk"
        place.mkdir()
        Path(name).chmod(0o755)
        mount = ["mount", "-t", "tmpfs", "-o", f"size={megabytes}m", "tmpfs", str(place)]
        subprocess.run(mount, check=True, capture_output=True)
        try:
            yield place
        finally:
            subprocess.run(["umount", "--lazy", str(place)], check=True)


@contextmanager
def filled(disk: Path, room_left: int) -> Iterator[None]:
    filler = disk / "filler"
    try:
        with filler.open("wb") as file:
            while not _took(file.fileno(), _room(disk) - room_left):
                pass
        yield
    finally:
        filler.unlink()


def _room(disk: Path) -> int:
    found = os.statvfs(disk)
    return found.f_bavail * found.f_frsize


def _took(file: int, size: int) -> bool:
    """False where the server took of the same room meanwhile."""
    try:
        os.posix_fallocate(file, 0, max(1, size))
    except OSError as why:
        if why.errno != errno.ENOSPC or size <= 1:
            raise
        return False
    return True


def tried_once(where: str, disk: Path, number: int, room_left: int, out: Outcome) -> bool:
    """Whether the entry was acknowledged."""
    out.tried += 1
    try:
        with filled(disk, room_left):
            open_lab(where).make_probes([f"P-{number}-{one}" for one in range(PROBES)])
    except RecordError as refused:
        out.refused += 1
        if not any(words in refused.message for words in WORDS):
            out.broken.append(f"{number}: {refused.message}")
        return False
    return True


def look(where: str, number: int, acknowledged: bool, before: Verification, out: Outcome) -> None:
    lab = open_lab(where)
    found = lab.verify(before.head if before.entries else None)
    out.broken += [f"{number}: {fault}" for fault in found.faults]
    there = sum(row["electrode"].startswith(f"P-{number}-") for row in lab.rows("electrodes"))
    out.lost += acknowledged and there == 0
    out.half += there not in (0, PROBES)
    lab.make_probes([f"AFTER-{number}"])


def on_file(times: int, seed: int = 1) -> Outcome:
    out, chance = Outcome(), random.Random(seed)  # noqa: S311 -- seeded, so that a failure can be had again
    for number in range(times):
        with small_disk(SQLITE_MB) as disk:
            where = str(disk / "record.db")
            set_up(where)
            before = open_lab(where).verify()
            done = tried_once(where, disk, number, chance.randrange(0, 1_500_000), out)
            look(where, number, done, before, out)
    return out


def on_server(times: int, seed: int = 1) -> Outcome:
    out, chance = Outcome(), random.Random(seed)  # noqa: S311 -- seeded, so that a failure can be had again
    with small_disk(POSTGRESQL_MB) as disk:
        one = Server(disk.parent, disk / "data", "min_wal_size = 32MB", "max_wal_size = 64MB")
        disk.parent.chmod(0o755)
        one.start()
        where = one.new_record()
        for number in range(times):
            before = open_lab(where).verify()
            done = tried_once(where, disk, number, chance.randrange(0, 700_000), out)
            if not answers(where):
                out.stopped += 1
                one.stop("immediate")
                one.start()
            look(where, number, done, before, out)
            where = one.new_record() if number % 8 == 7 else where
        one.stop("immediate")
    return out


def answers(where: str) -> bool:
    engine = create_engine(where)
    try:
        with engine.connect() as connection:
            return connection.exec_driver_sql("SELECT 1").scalar() == 1
    except Exception:
        return False
    finally:
        engine.dispose()


if __name__ == "__main__":
    times = int(sys.argv[1] if len(sys.argv) > 1 else 40)
    print("SQLite", on_file(times))
    print("PostgreSQL", on_server(times))
