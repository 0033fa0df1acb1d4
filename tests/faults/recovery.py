"""Back to the minute before an accident, by PostgreSQL's own means: a base backup, the log kept since, a target time.

    python tests/faults/recovery.py

README.md ("Several rigs, one record") says the same for a lab's server.
"""

from __future__ import annotations

import shutil
import sys
import tempfile
import time
from dataclasses import dataclass
from pathlib import Path

from sqlalchemy import make_url

sys.path.insert(0, str(Path(__file__).resolve().parents[2]))

from electrolog.lab import Lab, open_lab
from tests.faults.servers import Server

PATIENCE_S = 60.0


@dataclass(frozen=True)
class Recovered:
    """at_backup, at_target, at_accident: entries in the journal then; found: after the recovery."""

    at_backup: int
    at_target: int
    at_accident: int
    found: int
    whole: bool


def archiving(folder: Path) -> tuple[str, ...]:
    """The log's every finished piece is copied into `folder`, and never over one that is there."""
    return (
        "wal_level = replica",
        "archive_mode = on",
        f'archive_command = \'test ! -f "{folder}/%f" && cp "%p" "{folder}/%f"\'',
    )


def logged(lab: Lab, count: int) -> int:
    first = lab.verify().entries
    for number in range(first, first + count):
        lab.make_probes([f"P-{number}"])
    return lab.verify().entries


def accident(one: Server, where: str) -> None:
    one.run("DROP TABLE exposures CASCADE", str(make_url(where).database))


def finished(one: Server, archive: Path) -> None:
    """The piece of the log that is being written is closed, and waited for."""
    ((name,),) = one.run("SELECT pg_walfile_name(pg_switch_wal())")
    until = time.monotonic() + PATIENCE_S
    while not (archive / name).exists():
        assert time.monotonic() < until, "the log was not kept"
        time.sleep(0.1)


def brought_back(folder: Path, base: Path, archive: Path, target: str) -> Server:
    settings = (
        "archive_mode = off",
        f'restore_command = \'cp "{archive}/%f" "%p"\'',
        f"recovery_target_time = '{target}'",
        "recovery_target_action = 'promote'",
    )
    one = Server(folder, base, *settings)
    (base / "recovery.signal").touch()
    one.give(base / "recovery.signal")
    one.start()
    return one


def run(place: Path) -> Recovered:
    folder, archive, base, again = (place / name for name in ("one", "kept", "base", "two"))
    for path in (folder, archive, again):
        path.mkdir()
    one = Server(folder, None, *archiving(archive))
    for path in (place, archive, again):
        one.give(path)
    try:
        one.start()
        where = one.new_record()
        lab = open_lab(where)
        at_backup = logged(lab, 3)
        one.tool("pg_basebackup", "-h", folder, "-U", "postgres", "-c", "fast", "-D", base)
        at_target = logged(lab, 20)
        head = lab.verify().head
        ((target,),) = one.run("SELECT clock_timestamp()::text")
        at_accident = logged(lab, 5)
        accident(one, where)
        finished(one, archive)
    finally:
        one.stop("immediate")
    other = brought_back(again, base, archive, target)
    try:
        found = open_lab(other.url(str(make_url(where).database))).verify(head)
        return Recovered(at_backup, at_target, at_accident, found.entries, found.whole and found.since == 0)
    finally:
        other.stop("immediate")


def tried() -> Recovered:
    place = Path(tempfile.mkdtemp(prefix="pg"))
    try:
        return run(place)
    finally:
        shutil.rmtree(place, ignore_errors=True)


if __name__ == "__main__":
    print(tried())
