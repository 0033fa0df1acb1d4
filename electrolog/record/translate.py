"""The driver's words into ours: what happened, and what to do; of where, the database's name is all that is said."""

from __future__ import annotations

import sqlite3
from collections.abc import Iterator
from contextlib import contextmanager

from sqlalchemy.exc import DBAPIError

from electrolog.errors import PasswordNeeded, RecordError, shortened

_FULL = ("no room left on the disk of {}", "make room; nothing was written")
_CUT = (
    "the connection to {} was cut off",
    "an entry is there as a whole or not at all: look with `electrolog journal` before typing it again",
)
_IN_USE = ("{} is in use by another program for over a minute", "try again when it has finished")
_LOCKS = ("the place of {} gives no working locks", "keep the record on this machine's own disk, or on a server")
_UNTOLD = "no password supplied"
_WHERE_PASSWORDS_BELONG = "PGPASSFILE or a service file holds it; it is never kept here"
_DAMAGED = ("{} is damaged", "`electrolog rescue NEW` saves what can be saved; or `electrolog restore` a backup")
_KNOWN = {
    "unable to open": ("{} can't be opened", "look whether the folder is there and may be written"),
    "readonly": ("{} may not be written", "ask who owns the file, or name another with --db"),
    "is locked": _IN_USE,
    "lock timeout": _IN_USE,
    "locking protocol": _LOCKS,
    "is full": _FULL,
    "No space left": _FULL,
    "disk I/O error": ("the disk of {} can't be read or written", "copy what can be saved, then check it"),
    "not a database": ("{} is not a database", "look whether it is the file you mean"),
    "malformed": _DAMAGED,
    "Could not decode": _DAMAGED,
    "append-only": ("{}: the journal is append-only", ""),
    "terminating connection": _CUT,
    "server closed the connection": _CUT,
    "connection is closed": _CUT,
    "connection is lost": _CUT,
    _UNTOLD: ("{} asks for a password", _WHERE_PASSWORDS_BELONG),
    "password authentication failed": ("{}: the password is another one", _WHERE_PASSWORDS_BELONG),
    "permission denied": ("{}: this login may not do that", "a steward may, and admits others: `electrolog roles`"),
    "comes from the login": ("{}: who did it comes from the login, and can't be another", "log in as whoever did it"),
    "server's clock stands at": (
        "{}: this machine's clock and the server's are more than ten minutes apart",
        "set this machine's clock, then type the entry again",
    ),
    "own entries of the day": ("{}: the bench amends its own entries of the day", "ask a steward for any other"),
}


@contextmanager
def translated(name: str) -> Iterator[None]:
    try:
        yield
    except DBAPIError as error:
        raise _refusal(str(error.orig), name) from None
    except sqlite3.Error as error:  # of a copy, which is the driver's own matter
        raise _refusal(str(error), name) from None
    except UnicodeDecodeError:  # the driver fails over its own message, which quotes what a damaged page holds
        raise _refusal("malformed", name) from None


def _refusal(said: str, name: str) -> RecordError:
    for words, (message, hint) in _KNOWN.items():
        if words in said:
            kind = PasswordNeeded if words == _UNTOLD else RecordError
            return kind(message.format(name), hint)
    return RecordError(f"{name}: {shortened(said, 300)}")
