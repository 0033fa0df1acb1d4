"""Backups: whole whatever others write, named by what they hold, and never the cause of a loss when brought back."""

from __future__ import annotations

import os
import shutil
import sqlite3
import subprocess
import sys
import time
from collections.abc import Callable
from contextlib import closing
from pathlib import Path
from typing import Any

import pytest

from electrolog.errors import InputError, RecordError, TamperedRecord
from electrolog.lab import Lab, open_lab, rescue, restore
from electrolog.record import copying, migrate

Raw = Callable[..., list[Any]]


def where(lab: Lab) -> str:
    return lab.record.engine.url.render_as_string(False)


def rows(lab: Lab) -> copying.Fingerprint:
    with lab.record.reading() as connection:
        return copying.fingerprint(connection)


def test_a_backup_is_the_record_in_one_file(lived_in: Lab, tmp_path: Path) -> None:
    done = lived_in.back_up(tmp_path / "kept")
    assert [path.name for path in (tmp_path / "kept").iterdir()] == [done.path.name]
    assert f"-{done.entries}-{done.head[:16]}.db" in done.path.name
    copy = open_lab(str(done.path))
    assert copy.verify() == lived_in.verify()
    assert (done.entries, done.head) == (copy.verify().entries, copy.verify().head)
    assert rows(copy) == rows(lived_in)


def test_the_same_state_is_not_written_twice(lived_in: Lab, tmp_path: Path) -> None:
    first, again = lived_in.back_up(tmp_path), lived_in.back_up(tmp_path)
    assert (first.made, again.made) == (True, False)
    assert first.path == again.path


def test_a_backup_that_rotted_is_written_anew(lived_in: Lab, tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    kept = tmp_path / "kept"
    monkeypatch.setenv("ELECTROLOG_NOW", "2026-03-01T00:00:00Z")
    first = lived_in.back_up(kept)
    with closing(sqlite3.connect(first.path)) as connection:
        connection.execute("UPDATE exposures SET duration_min = 1")
        connection.commit()
    monkeypatch.setenv("ELECTROLOG_NOW", "2026-03-01T01:00:00Z")
    assert lived_in.back_up(kept).made


@pytest.mark.parametrize("clock", ["forward", "back"])
def test_rotation_keeps_the_newest_and_whatever_is_not_its_own(
    lived_in: Lab, tmp_path: Path, monkeypatch: pytest.MonkeyPatch, clock: str
) -> None:
    (tmp_path / "electrolog-notes.db").write_text("mine", encoding="utf-8")
    stranger = tmp_path / "electrolog-00000000-20200101T000000Z-5-0123456789abcdef.db"
    stranger.touch()
    for number in range(5):
        day = number + 1 if clock == "forward" else 28 - number
        monkeypatch.setenv("ELECTROLOG_NOW", f"2026-03-{day:02d}T00:00:00Z")
        lived_in.make_probes([f"NEW-{number}"])
        newest = lived_in.back_up(tmp_path, keep=2)
    assert newest.path.exists()
    assert stranger.exists()
    assert len(list(tmp_path.glob("electrolog-*-*-*-*.db"))) == 3
    assert (tmp_path / "electrolog-notes.db").exists()


def test_a_record_with_faults_is_kept_and_costs_no_older_backup(lived_in: Lab, raw: Raw, tmp_path: Path) -> None:
    good = lived_in.back_up(tmp_path)
    raw(lived_in, "UPDATE exposures SET duration_min = 1")
    lived_in.make_probes(["LATER"])
    done = lived_in.back_up(tmp_path, keep=1)
    assert "duration_min was changed" in done.faults[0]
    assert done.removed == ()
    assert good.path.exists()


def test_a_backup_is_one_state_while_others_write(lived_in: Lab, tmp_path: Path) -> None:
    code = (
        "import sys; from electrolog.lab import open_lab; lab = open_lab(sys.argv[1])\n"
        "for number in range(100000): lab.make_probes([f'BUSY-{number}'])"
    )
    busy = subprocess.Popen([sys.executable, "-c", code, where(lived_in)], stderr=subprocess.PIPE)
    try:
        before = lived_in.verify().entries
        while lived_in.verify().entries == before:
            assert busy.poll() is None
        found = [lived_in.back_up(tmp_path / str(number)) for number in range(3)]
    finally:
        busy.kill()
        busy.communicate()
    assert [one.faults for one in found] == [()] * 3
    assert all(open_lab(str(one.path)).verify().head == one.head for one in found)
    assert found[0].entries < found[2].entries
    assert lived_in.verify(found[1].head).whole


def test_a_place_that_cannot_be_written_is_said(lived_in: Lab, tmp_path: Path) -> None:
    (tmp_path / "file").touch()
    with pytest.raises(RecordError, match="can't be made"):
        lived_in.back_up(tmp_path / "file")


def test_what_a_killed_backup_left_is_swept_and_what_is_under_way_is_not(lived_in: Lab, tmp_path: Path) -> None:
    kept = tmp_path / "kept"
    kept.mkdir()
    left = [kept / f".electrolog-1-2.4711.electrolog-part{end}" for end in ("", "-wal", "-journal")]
    under_way, of_others = kept / ".electrolog-1-2.4712.electrolog-part", kept / ".editor.4711.part"
    for path in (*left, under_way, of_others):
        path.write_text("half", encoding="utf-8")
    for path in (*left, of_others):
        os.utime(path, (0, time.time() - copying.LEFT_BEHIND_S - 60))
    done = lived_in.back_up(kept)
    assert set(kept.iterdir()) == {under_way, of_others, done.path}


@pytest.mark.skipif(os.name != "posix", reason="POSIX's file modes")
@pytest.mark.parametrize("mode", [0o600, 0o640, 0o660])
def test_a_copy_is_as_closed_as_the_record(lived_in: Lab, tmp_path: Path, mode: int) -> None:
    if not lived_in.record.is_file:
        pytest.skip("a server's own matter")
    source = Path(lived_in.record.name)
    source.chmod(mode)
    kept = lived_in.back_up(tmp_path / "kept").path
    lived_in.move(str(tmp_path / "moved.db"))
    restore(str(tmp_path / "restored.db"), kept)
    rescue(str(source), str(tmp_path / "rescued.db"))
    copies = [kept, *(tmp_path / f"{name}.db" for name in ("moved", "restored", "rescued"))]
    copies += [migrate.copy_of_file(lived_in.record)]
    assert {path.name: oct(path.stat().st_mode & 0o777) for path in copies} == {path.name: oct(mode) for path in copies}


# --- bringing back ---------------------------------------------------------------------------------------------


def test_into_an_empty_place(lived_in: Lab, blank: str, tmp_path: Path) -> None:
    saved = lived_in.back_up(tmp_path / "kept")
    done = restore(blank, saved.path)
    assert (done.found, done.set_aside, done.head) == ("empty", None, saved.head)
    back = open_lab(blank)
    assert rows(back) == rows(lived_in)
    back.make_probes(["GOES-ON"])
    assert back.verify(saved.head).since == 1


def test_over_an_older_state_which_is_kept(lived_in: Lab, tmp_path: Path) -> None:
    if not lived_in.record.is_file:
        pytest.skip("a server's record is restored into an empty database")
    older = shutil.copy(lived_in.back_up(tmp_path / "before").path, tmp_path / "older.db")
    lived_in.make_probes(["LATER"])
    saved = lived_in.back_up(tmp_path / "kept")
    done = restore(str(older), saved.path)
    assert done.found == "older"
    assert done.set_aside is not None
    assert open_lab(str(done.set_aside)).verify().head != saved.head
    assert open_lab(str(older)).verify().head == saved.head


def test_never_over_newer_entries_unasked(lived_in: Lab, tmp_path: Path) -> None:
    if not lived_in.record.is_file:
        pytest.skip("a server's record is restored into an empty database")
    saved = lived_in.back_up(tmp_path / "kept")
    assert restore(where(lived_in), saved.path).found == "same"
    lived_in.make_probes(["NEWER"])
    newer = lived_in.verify()
    with pytest.raises(RecordError, match="newer entries") as refused:
        restore(lived_in.record.name, saved.path)
    assert "--replace" in refused.value.hint
    assert lived_in.verify() == newer
    done = restore(lived_in.record.name, saved.path, replace=True)
    assert done.found == "newer"
    assert done.set_aside is not None
    assert open_lab(str(done.set_aside)).verify() == newer
    assert lived_in.verify().head == saved.head  # also for whoever had the file open all the time


def test_never_over_another_record_unasked(lived_in: Lab, tmp_path: Path) -> None:
    if not lived_in.record.is_file:
        pytest.skip("a server's record is restored into an empty database")
    saved = lived_in.back_up(tmp_path / "kept")
    lived_in.make_probes(["ONE"])
    branched = shutil.copy(saved.path, tmp_path / "branch.db")
    open_lab(str(branched)).make_probes(["OTHER"])
    with pytest.raises(RecordError, match="different ways"):
        restore(lived_in.record.name, Path(branched))


def test_a_servers_record_is_never_written_over(lived_in: Lab, tmp_path: Path) -> None:
    if lived_in.record.is_file:
        pytest.skip("a server's own matter")
    saved = lived_in.back_up(tmp_path)
    lived_in.make_probes(["NEWER"])
    for replace in (False, True):
        with pytest.raises(RecordError, match="holds a record already"):
            restore(where(lived_in), saved.path, replace=replace)


@pytest.mark.parametrize("damage", ["text", "pages"])
def test_over_a_damaged_file_only_when_asked(lived_in: Lab, tmp_path: Path, damage: str) -> None:
    if not lived_in.record.is_file:
        pytest.skip("a file's own matter")
    saved = lived_in.back_up(tmp_path / "kept")
    path = tmp_path / "damaged.db"
    shutil.copy(saved.path, path)
    whole = path.read_bytes()
    path.write_bytes(b"nothing " * 1000 if damage == "text" else whole[:4096] + os.urandom(len(whole) - 4096))
    damaged = path.read_bytes()
    with pytest.raises(RecordError, match="can't be read"):
        restore(str(path), saved.path)
    done = restore(str(path), saved.path, replace=True)
    assert done.set_aside is not None
    assert done.set_aside.read_bytes() == damaged
    assert open_lab(str(path)).verify().head == saved.head


def test_a_backup_somebody_changed_is_not_brought_back(lived_in: Lab, blank: str, raw: Raw, tmp_path: Path) -> None:
    saved = lived_in.back_up(tmp_path / "kept")
    raw(open_lab(str(saved.path)), "UPDATE exposures SET duration_min = 1")
    with pytest.raises(TamperedRecord, match="duration_min was changed"):
        restore(blank, saved.path)
    with pytest.raises(InputError, match="there is no file"):
        restore(blank, tmp_path / "nothing.db")
    with pytest.raises(InputError, match="the same file"):
        restore(str(saved.path), saved.path)


# --- moving ------------------------------------------------------------------------------------------------------


def test_a_record_moves_between_engines_and_is_equal(lived_in: Lab, blank: str, tmp_path: Path) -> None:
    lived_in.strike("cleaning", "1", "never happened")
    lived_in.amend("exposure", "1", {"duration_min": "3h"}, "typed wrong")
    other = str(tmp_path / "other.db") if "://" in blank else blank
    for target in {other, blank}:
        done = lived_in.move(target)
        moved = open_lab(target)
        assert moved.verify(done.head) == lived_in.verify(done.head)
        assert rows(moved) == rows(lived_in)
        assert done.rows == {table: count for table, (count, _) in rows(lived_in).items()}
        moved.make_probes(["GOES-ON"])
        assert moved.verify(done.head).whole


def test_a_record_goes_to_a_server_and_back(lived_in: Lab, blank: str, tmp_path: Path) -> None:
    first = lived_in.move(blank)
    back = open_lab(blank).move(str(tmp_path / "back.db"))
    assert (first.head, first.rows) == (back.head, back.rows)


def test_a_place_that_is_taken_is_refused(lived_in: Lab, tmp_path: Path) -> None:
    taken = tmp_path / "taken.db"
    taken.write_bytes(b"a letter to a friend " * 100)
    for place in (where(lived_in), str(taken)):
        with pytest.raises(RecordError, match="holds a record already"):
            lived_in.move(place)
    assert taken.read_bytes().startswith(b"a letter")


# --- the anchor --------------------------------------------------------------------------------------------------


def test_a_cut_tail_is_found_by_a_head_written_down(lived_in: Lab, tmp_path: Path) -> None:
    """An earlier copy put in its place is whole in itself: its chain can't show what came after."""
    earlier = lived_in.back_up(tmp_path)
    lived_in.make_probes(["LATER"])
    head = lived_in.verify().head
    cut = open_lab(str(earlier.path))
    assert cut.verify().whole
    assert "its tail was cut off" in cut.verify(head).faults[0]
    assert lived_in.verify(head).since == 0
    assert lived_in.verify(earlier.head[:16].upper()).since == 1


@pytest.mark.parametrize("head", ["", "abc", "g" * 16, "0" * 65, "%" * 16])
def test_what_is_no_head_is_refused(shared: Lab, head: str) -> None:
    with pytest.raises(InputError, match="no journal head"):
        shared.verify(head)
