"""The keeping part of the one door: backups, where the record lives, and whether it can be trusted."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING

from electrolog.record.store import Record, default_location

if TYPE_CHECKING:
    from electrolog.record.backup import Backup
    from electrolog.record.rescue import Rescued
    from electrolog.record.restore import Moved, Restored
    from electrolog.record.roles import Roles
    from electrolog.record.verify import Verification


@dataclass(frozen=True)
class Keeping:
    record: Record

    def back_up(self, folder: Path, keep: int | None = None) -> Backup:
        """One checked file in `folder`, named by the journal's head; the oldest beyond `keep` are removed."""
        from electrolog.record.backup import back_up

        return back_up(self.record, folder, keep)

    def move(self, where: str) -> Moved:
        """Copies the whole record into an empty place, on any engine, and proves it equal; the old one stays."""
        from electrolog.record.restore import move

        return move(self.record, where)

    def roles(self, logins: Mapping[str, str]) -> Roles:
        """Makes the roles of a shared record, and admits logins (login -> role) to them."""
        from electrolog.record.roles import make

        return make(self.record, logins)

    def verify(self, head: str | None = None) -> Verification:
        """The journal replayed against the rows; with `head`, written down earlier, whether its tail is there."""
        from electrolog.answers.trust import verified

        return verified(self.record, head)


def restore(where: str | None, file: Path, *, replace: bool = False) -> Restored:
    """Puts a backup in the place of the record; what stood there is kept beside it.

    Raises RecordError where entries would be lost, unless `replace`.
    """
    from electrolog.record.restore import restore as put_back

    return put_back(default_location() if where is None else where, file, replace)


def rescue(where: str | None, target: str) -> Rescued:
    """A new record with all that a damaged one's journal still proves, its figures made again."""
    from electrolog.answers.figures import recompute
    from electrolog.record.rescue import rescue as save
    from electrolog.record.store import open_record

    done = save(default_location() if where is None else where, target)
    recompute(open_record(target))
    return done
