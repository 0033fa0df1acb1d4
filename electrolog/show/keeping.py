"""Where the record was kept, put back or moved to, with the head that names its state."""

from __future__ import annotations

from typing import TYPE_CHECKING

from electrolog.show.machine import print_json
from electrolog.show.tables import print_lines
from electrolog.show.text import one_line

if TYPE_CHECKING:
    from electrolog.record.backup import Backup
    from electrolog.record.rescue import Rescued
    from electrolog.record.restore import Moved, Restored
    from electrolog.record.roles import Roles

_FOUND = {"older": "an older state of it", "newer": "a newer state of it", "another": "another record"}


def answer_backup(done: Backup, json: bool) -> None:
    if json:
        print_json({**vars(done), "path": str(done.path), "removed": [str(path) for path in done.removed]})
        return
    print_lines(f"{one_line(done.path)}: {'written and checked' if done.made else 'is there already, and whole'}")
    print_lines(_state(done.entries, done.head))
    if done.removed:
        print_lines(f"{len(done.removed)} older removed")
    for fault in done.faults:
        print_lines(fault)
    if done.faults:
        print_lines(f"the record itself has {len(done.faults)} faults; no older backup was removed")


def answer_restored(done: Restored, json: bool) -> None:
    if json:
        print_json({**vars(done), "set_aside": None if done.set_aside is None else str(done.set_aside)})
        return
    same = done.found == "same"
    print_lines(f"{one_line(done.where)}: {'is what the backup holds already' if same else 'restored'}")
    print_lines(_state(done.entries, done.head))
    if done.set_aside is not None:
        before = _FOUND.get(done.found, "a file that can't be read")
        print_lines(f"what stood there ({before}) is kept as {one_line(done.set_aside)}")


def answer_moved(done: Moved, json: bool) -> None:
    if json:
        print_json(done)
        return
    print_lines(f"{one_line(done.target)}: equal to {one_line(done.source)} in {sum(done.rows.values())} rows")
    print_lines(_state(done.entries, done.head))
    print_lines("the old one stays as it was; from now on name the new one, with --db or ELECTROLOG_DB")


def answer_rescued(done: Rescued, json: bool) -> None:
    if json:
        print_json(done)
        return
    print_lines(f"{one_line(done.target)}: {done.rows} rows made again from {done.entries} entries, head {done.head}")
    print_lines(f"what came after is lost: {done.stopped}" if done.stopped else "the journal was whole to its end")


def answer_roles(roles: Roles, json: bool) -> None:
    if json:
        print_json(roles.holders)
        return
    for role, logins in roles.holders.items():
        print_lines(f"{role}: {', '.join(one_line(login) for login in logins) or 'nobody yet'}")


def _state(entries: int, head: str) -> str:
    return f"{entries} entries, head {head}"
