"""Replaying the journal against the tables: whatever was changed, added or removed behind its back is named."""

from __future__ import annotations

import json
import operator
import re
from dataclasses import dataclass
from typing import Any

from sqlalchemy import Connection, select

from electrolog.errors import InputError, shortened
from electrolog.record import journal, schema
from electrolog.record.sheets import BY_NAME, CALIBRATIONS, SHEETS

Place = tuple[str, int, int]  # sheet, row number, place of a point (0 for any other row)
Rows = dict[Place, dict[str, Any]]
UNREADABLE = (ValueError, TypeError, AttributeError)


@dataclass(frozen=True)
class Verification:
    entries: int
    head: str
    faults: tuple[str, ...]
    since: int | None = None  # entries written after the head that was asked for

    @property
    def whole(self) -> bool:
        return not self.faults


def verify(connection: Connection, anchor: str | None = None) -> Verification:
    """`anchor`: a head written down earlier, or its first signs; a chain alone can't show that its end was cut off.

    Raises InputError for an anchor that is too short to tell one entry from any other.
    """
    faults = _damage(connection)
    try:
        expected, count, head = _replayed(connection, faults)
        found = _found(connection)
    except UNREADABLE:  # a value of no kind that its column could ever have been given
        return Verification(0, journal.FIRST_HASH, (*faults, *_unreadable(connection)))
    for place in sorted(expected.keys() | found.keys()):
        faults += _compared(place, expected.get(place), found.get(place))
    since = None if anchor is None else _since(connection, anchor, faults)
    return Verification(count, head, tuple(faults), since)


def _damage(connection: Connection) -> list[str]:
    """What SQLite itself finds wrong in the file: an index that lost a row would hide it from every question."""
    if connection.dialect.name != "sqlite":
        return []
    found = connection.exec_driver_sql("PRAGMA integrity_check").scalars()
    return [f"file: {shortened(said)}" for said in found if said != "ok"]


def _unreadable(connection: Connection) -> list[str]:
    """Which rows hold such a value: each is asked for by itself."""
    faults = []
    for table in (schema.journal, *(schema.tables[sheet.name] for sheet in SHEETS)):
        key = [table.c[name] for name in ("seq", "id", "calibration_id", "ordinal") if name in table.c]
        for values in connection.execute(select(*key)).all():
            try:
                connection.execute(select(table).where(*map(operator.eq, key, values))).one()
            except UNREADABLE as why:
                place = (table.name, values[0], values[1] if len(values) > 1 else 0)
                faults.append(f"{_called(place, {})}: holds a value that can't be read ({shortened(str(why))})")
    return faults


def _since(connection: Connection, anchor: str, faults: list[str]) -> int | None:
    wanted = anchor.strip().casefold()
    if not re.fullmatch(r"[0-9a-f]{16,64}", wanted):
        raise InputError(
            f"head: '{shortened(anchor)}' is no journal head; accepted: its 64 signs, or the first 16 or more"
        )
    table = schema.journal
    seq = connection.execute(select(table.c.seq).where(table.c.hash.startswith(wanted))).scalar()
    if seq is None:
        faults.append(f"journal: no entry has the hash {wanted}: its tail was cut off, or this is another record")
        return None
    return journal.head(connection)[0] - int(seq)


def _replayed(connection: Connection, faults: list[str]) -> tuple[Rows, int, str]:
    rows: Rows = {}
    seq, previous = 0, journal.FIRST_HASH
    for mapping in connection.execute(select(schema.journal).order_by(schema.journal.c.seq)).mappings():
        raw = dict(mapping)
        seq += 1
        if raw["seq"] != seq:
            faults.append(f"journal: entries {seq} to {raw['seq'] - 1} are missing")
            seq = raw["seq"]
        if raw["previous_hash"] != previous:
            faults.append(f"journal entry {seq}: does not follow the entry before it")
        if journal.entry_hash(raw) != raw["hash"]:
            faults.append(f"journal entry {seq}: was changed after it was written")
        previous = raw["hash"]
        replay(rows, raw, faults)
    return rows, seq, previous


def replay(rows: Rows, raw: dict[str, Any], faults: list[str]) -> None:
    try:
        change = json.loads(raw["change"])
        place = (raw["sheet"], raw["row_id"], change.get("ordinal", 0))
        if raw["action"] == "add":
            _replay_add(rows, place, change)
        elif raw["action"] == "amend":
            rows[place].update(change["after"])
        else:
            rows[place]["struck"] = raw["seq"]
    except (KeyError, ValueError, TypeError, AttributeError):
        faults.append(f"journal entry {raw['seq']}: can't be replayed (it names a row that was never added)")


def _replay_add(rows: Rows, place: Place, change: dict[str, Any]) -> None:
    rows[place] = dict(change["after"])
    for number, (concentration, current) in enumerate(change.get("points", ()), start=1):
        rows["calibration_points", place[1], number] = {
            "calibration_id": place[1],
            "concentration_um": concentration,
            "current_na": current,
        }


def _found(connection: Connection) -> Rows:
    rows: Rows = {}
    for sheet in SHEETS:
        for row in connection.execute(select(schema.tables[sheet.name])).mappings():
            values = dict(row)
            row_id = values.pop("id") if "id" in values else values["calibration_id"]
            rows[sheet.name, row_id, values.pop("ordinal", 0)] = values
    return rows


def _compared(place: Place, expected: dict[str, Any] | None, found: dict[str, Any] | None) -> list[str]:
    what = _called(place, expected or found or {})
    if found is None:
        return [f"{what}: was removed behind the journal's back"]
    if expected is None:
        return [f"{what}: was added behind the journal's back"]
    plain = json.loads(journal.canonical(found))
    return [
        f"{what}: {name} was changed behind the journal's back, from {expected.get(name)!r} to {plain.get(name)!r}"
        for name in sorted(expected.keys() | plain.keys())
        if expected.get(name) != plain.get(name)
    ]


def _called(place: Place, row: dict[str, Any]) -> str:
    """As `amend` takes it: `exposure 119`, `calibration 4, point 2`; with its label where the row has one."""
    name, row_id, number = place
    if name == schema.journal.name:
        return f"journal entry {row_id}"
    if name not in BY_NAME:
        return shortened(name)
    if number:
        return f"{CALIBRATIONS.one} {row_id}, point {number}"
    sheet = BY_NAME[name]
    label = row.get(sheet.key[0]) if len(sheet.key) == 1 else None
    return f"{sheet.one} {row_id}" + (f" ({shortened(str(label))})" if label is not None else "")
