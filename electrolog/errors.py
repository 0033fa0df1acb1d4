"""Every refusal electrolog can give.

ElectrologError            exit 1   something failed
├── InputError             exit 2   what was typed or read can't be taken
│   ├── UnknownName        exit 2   a label or word the record doesn't know
│   └── FaultyRows         exit 2   a file's faults, all of them at once
├── DoubtfulEntry          exit 2   a likely slip that nobody confirmed
├── DataError              exit 1   numbers from which no answer can be made
├── RecordError            exit 1   the database itself: missing, locked, of another version
│   └── PasswordNeeded     exit 1   the server asks for one, and none was given
└── TamperedRecord         exit 1   verify found a row changed behind the journal's back

A message names what was found and what would be accepted; the hint says what to do. The translation to an
exit status happens once, at the command line's edge.
"""

from __future__ import annotations

import difflib
from collections.abc import Iterable, Sequence


class ElectrologError(Exception):
    kind = "failure"
    exit_code = 1

    def __init__(self, message: str, hint: str = "") -> None:
        super().__init__(message)
        self.message = message
        self.hint = hint


class InputError(ElectrologError):
    kind = "input"
    exit_code = 2


class UnknownName(InputError):
    kind = "unknown-name"


class FaultyRows(InputError):
    kind = "faulty-rows"

    def __init__(self, message: str, faults: Sequence[str], hint: str = "") -> None:
        super().__init__(message, hint)
        self.faults = tuple(faults)


class DoubtfulEntry(ElectrologError):
    kind = "doubtful"
    exit_code = 2

    def __init__(self, message: str, doubts: Sequence[str], hint: str = "") -> None:
        super().__init__(message, hint)
        self.doubts = tuple(doubts)


class DataError(ElectrologError):
    kind = "data"


class RecordError(ElectrologError):
    kind = "record"


class PasswordNeeded(RecordError):
    """Whoever has a terminal may ask for it."""


class TamperedRecord(ElectrologError):
    kind = "tampered"


def unknown(what: str, found: str, known: Iterable[str], hint: str = "") -> UnknownName:
    """The refusal of a name: names the nearest known one, or some of those that would be accepted."""
    names = sorted(set(known))
    folded = {name.casefold(): name for name in names}
    near = difflib.get_close_matches(found.casefold(), list(folded), n=1, cutoff=0.5)
    if near:
        said = f"the nearest known one is '{shortened(folded[near[0]])}'"
    elif names:
        said = f"known: {', '.join(shortened(name, 40) for name in names[:12])}{', …' if len(names) > 12 else ''}"
    else:
        said = "none is known yet"
    return UnknownName(f"no {what} is called '{shortened(found)}'; {said}", hint)


def with_article(word: str) -> str:
    return f"{'an' if word[0] in 'aeiou' else 'a'} {word}"


def shortened(text: str, most: int = 80) -> str:
    """User text for a message: one line, and not the 10,000 characters somebody pasted."""
    flat = " ".join(text.split())
    return flat if len(flat) <= most else flat[: most - 1] + "…"
