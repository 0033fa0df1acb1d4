"""Somebody with the file and with time: each tampering is one of many kinds, at a place that chance gave.

python tests/faults/tampering.py 300
"""

from __future__ import annotations

import json
import random
import re
import shutil
import sqlite3
import sys
import tempfile
from collections import Counter
from collections.abc import Callable
from contextlib import closing
from dataclasses import dataclass
from pathlib import Path
from typing import Any

sys.path.insert(0, str(Path(__file__).resolve().parents[2]))

from electrolog.lab import Lab, open_lab
from electrolog.record import journal, schema
from electrolog.record.sheets import POINTS, SHEETS

ANCHOR = "no entry has the hash"  # a chain alone can't show that its end is another


@dataclass(frozen=True)
class Done:
    """what was done, and the words by which `verify` must name just that place."""

    what: str
    named: str


Tamper = Callable[[sqlite3.Connection, random.Random], Done]


def change_cell(connection: sqlite3.Connection, chance: random.Random) -> Done:
    sheet, rowid, place = any_row(connection, chance)
    names = [row[1] for row in connection.execute(f"PRAGMA table_info({sheet})")]
    for name in chance.sample(names, len(names)):
        (old,) = connection.execute(f"SELECT {name} FROM {sheet} WHERE rowid = ?", (rowid,)).fetchone()
        new = another(old, chance)
        try:
            connection.execute(f"UPDATE {sheet} SET {name} = ? WHERE rowid = ?", (new, rowid))
        except sqlite3.IntegrityError:
            continue
        return Done(f"{sheet}.{name} {old!r} -> {new!r}", place)
    raise AssertionError(f"no cell of {sheet} can be changed")


def another(old: Any, chance: random.Random) -> Any:
    """Near enough to the old one to pass for it."""
    if old is None:
        return 1
    if isinstance(old, float):
        return old + 1e-9 if old == 0 else old * (1 + chance.choice((-1, 1)) * 10 ** chance.uniform(-12, 0))
    if isinstance(old, int):
        return old + chance.choice((-1, 1))
    place = chance.randrange(len(old))
    return old[:place] + chr(ord(old[place]) ^ 1) + old[place + 1 :]


def remove_row(connection: sqlite3.Connection, chance: random.Random) -> Done:
    sheet, rowid, place = any_row(connection, chance)
    connection.execute(f"DELETE FROM {sheet} WHERE rowid = ?", (rowid,))
    return Done(f"{sheet} {rowid} removed", place)


def insert_row(connection: sqlite3.Connection, chance: random.Random) -> Done:
    number = chance.randrange(1000, 9999)
    connection.execute("INSERT INTO electrodes (id, electrode) VALUES (?, ?)", (number, f"X-{number}"))
    return Done(f"probe {number} inserted", f"probe {number}")


def swap_rows(connection: sqlite3.Connection, chance: random.Random) -> Done:
    points = "SELECT rowid, ordinal, current_na FROM calibration_points WHERE calibration_id = 1"
    (one, number, a), (other, _, b) = chance.sample(connection.execute(points).fetchall(), 2)
    assert a != b
    connection.execute("UPDATE calibration_points SET current_na = ? WHERE rowid = ?", (b, one))
    connection.execute("UPDATE calibration_points SET current_na = ? WHERE rowid = ?", (a, other))
    return Done(f"points {one} and {other} swapped", f"calibration 1, point {number}")


def change_entry(connection: sqlite3.Connection, chance: random.Random) -> Done:
    seq = any_entry(connection, chance)
    name = chance.choice(("at", "who", "reason", "change", "previous_hash", "hash", "row_id"))
    (old,) = connection.execute(f"SELECT {name} FROM journal WHERE seq = ?", (seq,)).fetchone()
    connection.execute(f"UPDATE journal SET {name} = ? WHERE seq = ?", (another(old or "x", chance), seq))
    return Done(f"journal {seq}.{name}", f"journal entry {seq}")


def remove_entry(connection: sqlite3.Connection, chance: random.Random) -> Done:
    seq, last = any_entry(connection, chance), entries(connection)[-1]
    connection.execute("DELETE FROM journal WHERE seq = ?", (seq,))
    return Done(f"journal {seq} removed", f"entries {seq} to {seq} are missing" if seq < last else ANCHOR)


def close_the_gap(connection: sqlite3.Connection, chance: random.Random) -> Done:
    """An entry gone, its row too, and all after it renumbered."""
    seq, last = any_entry(connection, chance), entries(connection)[-1]
    connection.execute("DELETE FROM journal WHERE seq = ?", (seq,))
    for (later,) in connection.execute("SELECT seq FROM journal WHERE seq > ? ORDER BY seq", (seq,)).fetchall():
        connection.execute("UPDATE journal SET seq = ? WHERE seq = ?", (later - 1, later))
    return Done(f"journal {seq} removed, the rest moved up", f"journal entry {seq}" if seq < last else ANCHOR)


def reorder_entries(connection: sqlite3.Connection, chance: random.Random) -> Done:
    one, other = sorted(chance.sample(entries(connection), 2))
    for a, b in ((one, -1), (other, one), (-1, other)):
        connection.execute("UPDATE journal SET seq = ? WHERE seq = ?", (b, a))
    return Done(f"journal {one} and {other} changed places", f"journal entry {one}")


def forge_entry(connection: sqlite3.Connection, chance: random.Random) -> Done:
    """Changed together with its own hash, and with the row that it tells of."""
    seq = chance.choice(entries(connection)[:-1])
    rehash(connection, seq, f"forged {chance.random()}")
    return Done(f"journal {seq} forged with its hash", f"journal entry {seq + 1}")


def rewrite_to_the_end(connection: sqlite3.Connection, chance: random.Random) -> Done:
    """The whole chain made anew from there: nothing in the file betrays it, a head written down does."""
    seqs = entries(connection)
    first = chance.choice(seqs)
    for seq in seqs[seqs.index(first) :]:
        rehash(connection, seq, "forged" if seq == first else None)
    return Done(f"journal rewritten from {first}", ANCHOR)


def cut_tail(connection: sqlite3.Connection, chance: random.Random) -> Done:
    """The newest entries with all their rows: nothing in the file betrays it, a head written down does."""
    last = entries(connection)[-1]
    keep = last - chance.randrange(1, 3)
    for seq in range(last, keep, -1):
        found = connection.execute("SELECT sheet, row_id FROM journal WHERE seq = ?", (seq,))
        ((sheet, row_id),) = found.fetchall()
        connection.execute(f"DELETE FROM {sheet} WHERE id = ?", (row_id,))
        connection.execute("DELETE FROM journal WHERE seq = ?", (seq,))
    return Done(f"journal cut after {keep}", ANCHOR)


def rehash(connection: sqlite3.Connection, seq: int, reason: str | None) -> None:
    columns = ("seq", "at", "who", "action", "sheet", "row_id", "reason", "change", "previous_hash")
    found = connection.execute(f"SELECT {', '.join(columns)} FROM journal WHERE seq = ?", (seq,)).fetchone()
    row = dict(zip(columns, found, strict=True))
    before = connection.execute("SELECT hash FROM journal WHERE seq = ?", (seq - 1,)).fetchone()
    row["previous_hash"] = before[0] if before else journal.FIRST_HASH
    row["reason"] = row["reason"] if reason is None else reason
    moment = schema.UtcMoment().process_result_value(row["at"], None)  # type: ignore[arg-type]
    values = (row["reason"], row["previous_hash"], journal.entry_hash({**row, "at": moment}), seq)
    connection.execute("UPDATE journal SET reason = ?, previous_hash = ?, hash = ? WHERE seq = ?", values)


def forge_figures(connection: sqlite3.Connection, chance: random.Random) -> Done:
    ((number, kept),) = [
        chance.choice(connection.execute("SELECT calibration_id, figures FROM calibration_figures").fetchall())
    ]
    figures = json.loads(kept)
    name = chance.choice(("sensitivity_na_um", "lod_um", "r_squared", "intercept_na"))
    figures[name] = (figures[name] or 1.0) * 1.01
    connection.execute(
        "UPDATE calibration_figures SET figures = ? WHERE calibration_id = ?", (json.dumps(figures), number)
    )
    ((label,),) = connection.execute("SELECT calibration FROM calibrations WHERE id = ?", (number,)).fetchall()
    return Done(f"kept {name} of calibration {number}", f"calibration {label}: its kept {name}")


def spoil_fit(connection: sqlite3.Connection, chance: random.Random) -> Done:
    """One sign of a kept fit, or of what says how much it has seen: another forecast, and nobody would know why."""
    places = [("kept_fits", name) for name in ("fit", "fingerprint", "seen_readings", "seen_newest", "seen_correction")]
    table, name = chance.choice([*places, *[("kept_fit_units", name) for name in ("fit", "unit")]])
    rowid, old = chance.choice(connection.execute(f"SELECT rowid, {name} FROM {table}").fetchall())
    connection.execute(f"UPDATE {table} SET {name} = ? WHERE rowid = ?", (another(old, chance), rowid))
    return Done(f"{table}.{name}", "kept fit of dopamine")


def any_row(connection: sqlite3.Connection, chance: random.Random) -> tuple[str, int, str]:
    """Sheet, SQLite's own number of the row, and how `verify` calls it."""
    filled = [s for s in SHEETS if connection.execute(f"SELECT count(*) FROM {s.name}").fetchone()[0]]
    sheet = chance.choice(filled)
    rowid = chance.choice(connection.execute(f"SELECT rowid FROM {sheet.name}").fetchall())[0]
    if sheet is not POINTS:
        return sheet.name, rowid, f"{sheet.one} {rowid}"
    place = connection.execute(f"SELECT calibration_id, ordinal FROM {sheet.name} WHERE rowid = ?", (rowid,))
    ((calibration, ordinal),) = place.fetchall()
    return sheet.name, rowid, f"calibration {calibration}, point {ordinal}"


def entries(connection: sqlite3.Connection) -> list[int]:
    return [seq for (seq,) in connection.execute("SELECT seq FROM journal ORDER BY seq")]


def any_entry(connection: sqlite3.Connection, chance: random.Random) -> int:
    return chance.choice(entries(connection))


KINDS: tuple[Tamper, ...] = (
    *(change_cell, change_cell, change_cell, remove_row, insert_row, swap_rows, change_entry, change_entry),
    *(remove_entry, close_the_gap, reorder_entries, forge_entry, rewrite_to_the_end, cut_tail, forge_figures),
    spoil_fit,
)


def tamper(whole: Path, copy: Path, seed: int) -> tuple[str, Done]:
    """A copy with one tampering in it; which kind, and what it did."""
    shutil.copy(whole, copy)
    kind = KINDS[seed % len(KINDS)]
    chance = random.Random(seed)  # noqa: S311 -- seeded, so that a failure can be had again
    with closing(sqlite3.connect(copy)) as connection:
        for (trigger,) in connection.execute("SELECT name FROM sqlite_master WHERE type = 'trigger'").fetchall():
            connection.execute(f"DROP TRIGGER {trigger}")
        connection.execute("PRAGMA ignore_check_constraints = ON")
        did = kind(connection, chance)
        connection.commit()
    return kind.__name__, did


def missed(lab: Lab, count: int, folder: Path) -> tuple[Counter[str], list[str]]:
    """How many of each kind were tried, and those that `verify` with a backup's head did not find, or not name."""
    lab.cohort_fit("dopamine")
    whole = lab.back_up(folder / "whole")
    tried, overlooked = Counter[str](), []
    for seed in range(count):
        copy = folder / "tampered.db"
        kind, did = tamper(whole.path, copy, seed)
        tried[kind] += 1
        faults = open_lab(str(copy)).verify(whole.head).faults
        if not any(re.search(rf"\b{re.escape(did.named)}\b", fault) for fault in faults):
            overlooked.append(f"seed {seed}: {did.what}; {did.named!r} is not in {faults}")
    return tried, overlooked


if __name__ == "__main__":
    from tests.record.conftest import live

    with tempfile.TemporaryDirectory() as name:
        lab = live(open_lab(str(Path(name) / "record.db"), who="wren", create=True))
        found, overlooked = missed(lab, int(sys.argv[1] if len(sys.argv) > 1 else 300), Path(name))
    print(f"{found.total()} tamperings, {found.total() - len(overlooked)} found and named: {dict(found)}")
    print("\n".join(overlooked))
