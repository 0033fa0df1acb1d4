"""The journal guards the record: what is changed, added or removed behind its back is named."""

from __future__ import annotations

import hashlib
import json
import sqlite3
from collections.abc import Callable
from contextlib import closing
from typing import Any

import pytest

from electrolog.lab import Lab
from electrolog.record import journal, schema
from electrolog.record.sheets import SHEETS

Raw = Callable[..., list[Any]]


@pytest.fixture
def unguarded(lived_in: Lab, raw: Raw) -> Lab:
    """The record once somebody has taken its triggers away."""
    if lived_in.record.is_file:
        for (name,) in raw(lived_in, "SELECT name FROM sqlite_master WHERE type = 'trigger'"):
            raw(lived_in, f"DROP TRIGGER {name}")
    else:
        for name in [*(sheet.name for sheet in SHEETS), "journal"]:
            raw(lived_in, f"DROP TRIGGER guard_{name} ON {name}")
    return lived_in


def faults(lab: Lab) -> list[str]:
    return list(lab.verify().faults)


def test_a_record_nobody_touched_is_whole(shared: Lab) -> None:
    found = shared.verify()
    assert found.whole
    entries = shared.journal()
    assert found.entries == len(entries) == entries[-1].seq
    assert found.head == entries[-1].hash


def test_each_entry_follows_the_one_before(shared: Lab) -> None:
    entries = shared.journal()
    assert entries[0].previous_hash == journal.FIRST_HASH
    assert [e.previous_hash for e in entries[1:]] == [e.hash for e in entries[:-1]]
    assert [e.seq for e in entries] == list(range(1, len(entries) + 1))


def test_the_hash_can_be_made_without_electrolog(shared: Lab, raw: Raw) -> None:
    """SHA-256 over the JSON list of the columns in their order, as anybody can recompute it."""
    columns = "seq, at, who, action, sheet, row_id, reason, change, previous_hash, hash"
    *parts, found = raw(shared, f"SELECT {columns} FROM journal ORDER BY seq DESC LIMIT 1")[0]
    parts[1] = parts[1] if isinstance(parts[1], str) else schema.fixed_width(parts[1])
    assert hashlib.sha256(json.dumps(parts, separators=(",", ":")).encode()).hexdigest() == found


@pytest.mark.parametrize(
    ("statement", "named"),
    [
        ("UPDATE exposures SET duration_min = 60 WHERE id = 1", "exposure 1: duration_min was changed"),
        ("UPDATE exposures SET note = 'x' WHERE id = 1", "exposure 1: note was changed"),
        ("UPDATE calibrations SET noise_na = NULL WHERE id = 1", "calibration 1 (C0001): noise_na was changed"),
        (
            "UPDATE calibration_points SET current_na = 1 WHERE calibration_id = 1 AND ordinal = 3",
            "calibration 1, point 3: current_na",
        ),
        ("UPDATE cleanings SET at = '2026-01-08T16:00:01.000000Z' WHERE id = 1", "cleaning 1: at was changed"),
        ("UPDATE batches SET made_on = '2026-01-06' WHERE id = 1", "batch 1 (B1): made_on was changed"),
        ("UPDATE calibrations SET struck = 3 WHERE id = 1", "calibration 1 (C0001): struck was changed"),
        ("UPDATE electrodes SET electrode = 'B1-99' WHERE id = 2", "probe 2 (B1-02): electrode was changed"),
        ("DELETE FROM recuts", "re-cut 1: was removed"),
        (
            "DELETE FROM calibration_points WHERE calibration_id = 2 AND ordinal = 6",
            "calibration 2, point 6: was removed",
        ),
        ("INSERT INTO electrodes (id, electrode) VALUES (77, 'X')", "probe 77 (X): was added"),
        (
            "INSERT INTO calibration_points (calibration_id, ordinal, concentration_um, current_na) "
            "VALUES (1, 7, 1, 1)",
            "calibration 1, point 7: was added",
        ),
    ],
)
def test_a_row_touched_behind_its_back_is_named(unguarded: Lab, raw: Raw, statement: str, named: str) -> None:
    raw(unguarded, statement)
    (fault,) = faults(unguarded)
    assert named in fault
    assert not unguarded.verify().whole


def test_a_strike_undone_is_named(unguarded: Lab, raw: Raw) -> None:
    unguarded.strike("cleaning", "1", "never happened")
    assert faults(unguarded) == []
    raw(unguarded, "UPDATE cleanings SET struck = NULL")
    assert "cleaning 1: struck was changed" in faults(unguarded)[0]


@pytest.mark.parametrize(
    "change",
    ["reason = 'better'", "who = 'finch'", "action = 'strike'", "row_id = 2", "at = '2020-01-01T00:00:00.000000Z'"],
)
def test_a_changed_entry_is_named(unguarded: Lab, raw: Raw, change: str) -> None:
    last = unguarded.verify().entries
    raw(unguarded, f"UPDATE journal SET {change} WHERE seq = {last - 1}")
    assert f"journal entry {last - 1}: was changed after it was written" in faults(unguarded)


def test_a_removed_entry_breaks_the_chain(unguarded: Lab, raw: Raw) -> None:
    last = unguarded.verify().entries
    raw(unguarded, f"DELETE FROM journal WHERE seq = {last - 1}")
    said = faults(unguarded)
    assert f"journal: entries {last - 1} to {last - 1} are missing" in said
    assert f"journal entry {last}: does not follow the entry before it" in said


def test_an_entry_rewritten_with_its_hash_breaks_the_link_after_it(unguarded: Lab, raw: Raw) -> None:
    entries = unguarded.journal()
    ((change,),) = raw(unguarded, f"SELECT change FROM journal WHERE seq = {entries[-2].seq}")
    row = {**vars(entries[-2]), "reason": "forged", "change": change}
    raw(
        unguarded,
        f"UPDATE journal SET reason = 'forged', hash = :h WHERE seq = {row['seq']}",
        h=journal.entry_hash(row),
    )
    assert f"journal entry {entries[-1].seq}: does not follow the entry before it" in faults(unguarded)


def test_the_newest_entries_cut_off_change_the_head(unguarded: Lab, raw: Raw) -> None:
    """A chain can't show that its end is missing; its head, written down elsewhere, can. Its row shows too."""
    before = unguarded.verify()
    raw(unguarded, f"DELETE FROM journal WHERE seq = {before.entries}")
    after = unguarded.verify()
    assert (after.entries, after.head) != (before.entries, before.head)
    assert "was added behind the journal's back" in after.faults[0]


@pytest.mark.parametrize(
    ("statement", "named"),
    [
        ("UPDATE standards SET prepared_at = '2026,01-07T08:00:00.000000Z'", "standard 1: holds a value"),
        ("UPDATE journal SET at = '2026-99-01T08:00:00.000000Z' WHERE seq = 22", "journal entry 22: holds a value"),
    ],
)
def test_a_value_that_no_column_could_be_given_is_named(unguarded: Lab, statement: str, named: str) -> None:
    if not unguarded.record.is_file:
        pytest.skip("PostgreSQL's types hold no such value")
    with closing(sqlite3.connect(unguarded.record.name)) as connection:
        connection.execute("PRAGMA ignore_check_constraints = ON")
        connection.execute(statement)
        connection.commit()
    assert any(named in fault for fault in faults(unguarded))


@pytest.mark.parametrize(
    "change", ["not json", "[]", "null", '{"after": 3}', '{"after": {}, "points": [1]}', "{}", '{"ordinal": "x"}']
)
def test_an_entry_that_makes_no_sense_is_named_and_nothing_falls_over(unguarded: Lab, raw: Raw, change: str) -> None:
    last = unguarded.verify().entries
    raw(unguarded, "UPDATE journal SET change = :change WHERE seq = :last", change=change, last=last)
    assert f"journal entry {last}: was changed after it was written" in faults(unguarded)


def test_all_faults_are_named_at_once(unguarded: Lab, raw: Raw) -> None:
    raw(unguarded, "UPDATE exposures SET duration_min = 60")
    raw(unguarded, "DELETE FROM recuts")
    raw(unguarded, "INSERT INTO electrodes (id, electrode) VALUES (77, 'X')")
    assert len(faults(unguarded)) == 3


@pytest.mark.parametrize(("figure", "value"), [("sensitivity_na_um", 99.0), ("lod_um", None), ("n_points", 7)])
def test_forged_figures_are_named(lived_in: Lab, raw: Raw, figure: str, value: Any) -> None:
    """They are no part of the journal, and what everybody looks at."""
    ((kept,),) = raw(lived_in, "SELECT figures FROM calibration_figures WHERE calibration_id = 1")
    forged = json.dumps({**json.loads(kept), figure: value})
    raw(lived_in, "UPDATE calibration_figures SET figures = :forged WHERE calibration_id = 1", forged=forged)
    (fault,) = faults(lived_in)
    assert f"calibration C0001: its kept {figure} is {value}" in fault
    lived_in.recompute()
    assert lived_in.verify().whole


def test_figures_that_are_not_there_are_no_fault(lived_in: Lab, raw: Raw) -> None:
    raw(lived_in, "DELETE FROM calibration_figures")
    assert lived_in.verify().whole
