"""Several probes named in one word: `B1-01..B1-08`, `B1-01..08`, `B1-01,B1-04`."""

from __future__ import annotations

import re
from collections.abc import Iterable

from electrolog.errors import InputError, shortened
from electrolog.record.names import Names
from electrolog.record.store import Connection

_NUMBERED = re.compile(r"(.*?)(\d+)", re.DOTALL)
MOST = 10_000
FEW = 20  # names are looked up one by one; beyond it all labels are read once


def expanded(names: Iterable[str], known: Iterable[str] = ()) -> list[str]:
    """The labels meant, each once, in the order named. A label that is known as it stands is never taken apart.

    Raises InputError for a range that can't be read.
    """
    existing = set(known)
    labels: dict[str, None] = {}
    for name in names:
        parts = [name] if name in existing else [part.strip() for part in name.split(",")]
        for part in parts:
            for label in [part] if part in existing or ".." not in part else _range(part):
                labels[label] = None
    if "" in labels:
        raise InputError("a label is empty; accepted: such as B1-01, or several as B1-01..B1-08 or B1-01,B1-04")
    return list(labels)


def known_labels(connection: Connection, names: Iterable[str], lookup: Names | None = None) -> list[str]:
    """Labels as the record spells them. Raises UnknownName for the first that it doesn't know."""
    lookup, names = lookup or Names(connection), list(names)
    if len(names) > FEW:
        lookup.everything("electrodes")
    plain = [name for name in names if lookup.find("electrodes", name) is not None]
    rest = len(plain) < len(names)
    known = lookup.everything("electrodes") if rest else {}
    chosen = plain if not rest else expanded(names, (spelling for spelling, _ in known.values()))
    for label in chosen:
        lookup.row_id("electrodes", label)
    return list(dict.fromkeys(lookup.spelled("electrodes", label) or label for label in chosen))


def numbered(stem: str, first: int, count: int) -> list[str]:
    """`count` labels of one stem: B9-01, B9-02, …"""
    if not 1 <= count <= MOST:
        raise InputError(f"count: {count} is out of range; accepted: 1 to {MOST}")
    width = max(2, len(str(first + count - 1)))
    return [f"{stem}-{number:0{width}d}" for number in range(first, first + count)]


def _range(text: str) -> list[str]:
    first, _, last = text.partition("..")
    start, end = _NUMBERED.fullmatch(first.strip()), _NUMBERED.fullmatch(last.strip())
    if not start or not end or end[1] not in ("", start[1]) or int(end[2]) < int(start[2]):
        raise InputError(f"'{shortened(text)}' is no range; accepted: such as B1-01..B1-08 or B1-01..08, rising")
    low, high, width = int(start[2]), int(end[2]), len(start[2])
    if high - low >= MOST:
        raise InputError(f"'{shortened(text)}' names {high - low + 1} probes; accepted: up to {MOST} at once")
    return [f"{start[1]}{number:0{width}d}" for number in range(low, high + 1)]
