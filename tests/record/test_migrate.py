"""Migrations on records with rows in them: up, down, and a checked copy before anything is touched."""

from __future__ import annotations

import sqlite3
from collections.abc import Callable
from contextlib import closing
from pathlib import Path
from typing import Any

import pytest
from sqlalchemy import inspect
from sqlalchemy.exc import IntegrityError

from electrolog.errors import RecordError
from electrolog.lab import Lab, open_lab, set_up
from electrolog.record import builtin, migrate, schema
from electrolog.record.store import connected, open_record
from tests.faults import migrating

Raw = Callable[..., list[Any]]


def revision(lab: Lab, raw: Raw) -> Any:
    return raw(lab, "SELECT version_num FROM alembic_version")


def test_a_record_is_made_once(blank: str) -> None:
    assert set_up(blank).what == "made"
    assert set_up(blank).what == "up to date already"
    lab = open_lab(blank)
    assert len(lab.rows("analytes")) == len(builtin.ANALYTES)
    assert {entry.reason for entry in lab.journal()} == {builtin.REASON}
    assert lab.verify().whole


@pytest.mark.parametrize("door", ["setup", "create"])
def test_a_record_whose_making_was_interrupted_is_made_to_the_end(blank: str, door: str) -> None:
    migrate.make_tables(connected(blank))
    with pytest.raises(RecordError, match="holds no record"):
        open_lab(blank)
    if door == "setup":
        assert set_up(blank).what == "made"
    lab = open_lab(blank, create=True)
    assert len(lab.rows("analytes")) == len(builtin.ANALYTES)
    assert lab.verify().whole


def test_a_populated_record_goes_down_and_up_again(lived_in: Lab, raw: Raw) -> None:
    migrate.to_revision(lived_in.record, "base")
    assert set(inspect(lived_in.record.engine).get_table_names()) == {"alembic_version"}
    migrate.to_revision(lived_in.record, schema.REVISION)
    assert revision(lived_in, raw) == [(schema.REVISION,)]
    builtin.add_all(lived_in.record)
    assert lived_in.verify().whole
    with pytest.raises(Exception, match="keeps every row"):
        raw(lived_in, "DELETE FROM analytes")


def test_a_fit_kept_in_another_layout_is_thrown_away_and_made_again(lived_in: Lab, raw: Raw) -> None:
    lived_in.cohort_fit("dopamine")
    migrate.to_revision(lived_in.record, "0001")
    assert "seen_newest" not in {column["name"] for column in inspect(lived_in.record.engine).get_columns("kept_fits")}
    columns = "analyte_id, method, fingerprint, seen_readings, seen_correction, made_at, fit"
    values = "id, 'cohort-0', 'x', 2, 0, '2026-01-01T00:00:00.000000Z', '{}'"
    raw(lived_in, f"INSERT INTO kept_fits ({columns}) SELECT {values} FROM analytes WHERE analyte = 'dopamine'")
    migrate.to_revision(lived_in.record, schema.REVISION)
    assert raw(lived_in, "SELECT * FROM kept_fits") == []
    assert lived_in.cohort_fit("dopamine").calibrations == 2
    assert lived_in.verify().whole


def test_migrating_to_where_it_stands_changes_nothing(lived_in: Lab, raw: Raw) -> None:
    before = lived_in.verify()
    migrate.to_revision(lived_in.record, schema.REVISION)
    assert lived_in.verify() == before
    assert revision(lived_in, raw) == [(schema.REVISION,)]


def test_a_revision_nobody_ever_made_is_refused(lived_in: Lab, raw: Raw) -> None:
    raw(lived_in, "UPDATE alembic_version SET version_num = '0000'")
    with pytest.raises(RecordError, match="older version"):
        open_record(str(lived_in.record.engine.url.render_as_string(False)))
    with pytest.raises(RecordError, match="has never had"):
        migrate.to_revision(lived_in.record, schema.REVISION)


def test_a_newer_record_is_left_alone(lived_in: Lab, raw: Raw) -> None:
    raw(lived_in, "UPDATE alembic_version SET version_num = '9999'")
    where = lived_in.record.engine.url.render_as_string(False)
    for door in (open_lab, set_up):
        with pytest.raises(RecordError, match="newer electrolog"):
            door(where)


def test_a_copy_is_whole(lived_in: Lab) -> None:
    if not lived_in.record.is_file:
        pytest.skip("a server's database is copied by its own tools")
    copy = migrate.copy_of_file(lived_in.record)
    assert copy.parent == Path(lived_in.record.name).parent
    assert open_lab(str(copy)).verify() == lived_in.verify()
    with closing(sqlite3.connect(copy)) as connection:
        assert connection.execute("PRAGMA integrity_check").fetchall() == [("ok",)]


def test_a_copy_holds_what_is_still_in_the_write_ahead_log(lived_in: Lab) -> None:
    if not lived_in.record.is_file:
        pytest.skip("a file's own matter")
    with closing(sqlite3.connect(lived_in.record.name)) as keeps_the_log:
        keeps_the_log.execute("PRAGMA wal_autocheckpoint = 0")
        keeps_the_log.execute("SELECT count(*) FROM journal").fetchone()
        lived_in.make_probes(["LATE-1"])
        copy = migrate.copy_of_file(lived_in.record)
    assert open_lab(str(copy)).labels(["LATE-1"]) == ["LATE-1"]


def test_bringing_an_older_record_up_makes_a_copy_first(lived_in: Lab, raw: Raw) -> None:
    """From the newest revision it is no step at all: the copy holds the record as it was."""
    before = lived_in.verify()
    copy = migrate.upgrade(lived_in.record)
    assert lived_in.verify() == before
    if lived_in.record.is_file:
        assert copy is not None
        assert open_lab(str(copy)).verify() == before
    else:
        assert copy is None


def test_a_migration_that_would_break_a_link_is_rolled_back(lived_in: Lab, raw: Raw) -> None:
    if not lived_in.record.is_file:
        pytest.skip("PostgreSQL checks links itself")
    with closing(sqlite3.connect(lived_in.record.name)) as connection:  # foreign keys are off here
        connection.execute("UPDATE exposures SET electrode_id = 999")
        connection.commit()
    with pytest.raises(RecordError, match="break 1 links"):
        migrate.to_revision(lived_in.record, schema.REVISION)


def test_links_are_held_by_the_very_process_that_made_the_record(blank: str) -> None:
    lab = open_lab(blank, create=True)
    with pytest.raises(IntegrityError), lab.record.engine.begin() as connection:
        connection.exec_driver_sql("INSERT INTO electrodes (id, electrode, batch_id) VALUES (1, 'P1', 999)")


def test_a_new_record_is_in_write_ahead_mode(blank: str) -> None:
    """Readers block nobody, and nobody blocks them."""
    if "://" in blank:
        pytest.skip("a file's own matter")
    set_up(blank)
    with closing(sqlite3.connect(blank)) as connection:
        assert connection.execute("PRAGMA journal_mode").fetchone() == ("wal",)


def test_a_migration_that_fails_leaves_the_record_and_names_the_copy(
    lived_in: Lab, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    where, before = lived_in.record.engine.url.render_as_string(False), lived_in.verify()
    folder = migrating.folder_with(tmp_path, more="    op.execute('UPDATE nowhere SET it = 1')\n")
    monkeypatch.setattr(migrate, "migrations_folder", lambda: folder)
    monkeypatch.setattr(schema, "REVISION", migrating.NEXT)
    with pytest.raises(RecordError, match="the upgrade stopped") as refused:
        set_up(where)
    assert migrating.state(where) == (migrating.NOW, before)
    if lived_in.record.is_file:
        (copy,) = migrating.copies_of(lived_in.record)
        assert str(copy) in refused.value.hint
        assert migrating.state(str(copy)) == (migrating.NOW, before)


def test_a_migration_killed_at_any_step_leaves_the_record_and_a_whole_copy(lived_in: Lab, tmp_path: Path) -> None:
    """A few of the steps that tests/faults/migrating.py tries."""
    where, before = lived_in.record.engine.url.render_as_string(False), lived_in.verify()
    folder, out = migrating.folder_with(tmp_path), migrating.Outcome()
    migrating.end_once(where, folder, "statement", 10, before, out)
    assert (out.tried, out.as_it_was, out.broken) == (1, 1, [])
    assert out.copies == (1 if lived_in.record.is_file else 0)
