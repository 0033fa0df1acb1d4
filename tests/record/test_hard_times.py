"""Few of what the scripts in tests/faults do by the hundred: kills, tamperings, damaged files, hostile input."""

from __future__ import annotations

import shutil
import sys
from pathlib import Path

import pytest

from electrolog.lab import Lab, open_lab, rescue
from tests.faults import damage, full, fuzz, killed, recovery, restarts, tampering


@pytest.mark.skipif(sys.platform == "win32", reason="SIGKILL and fork are POSIX's")
def test_killed_at_any_moment_nothing_is_lost_doubled_or_broken() -> None:
    found = killed.run(1, seed=7)
    assert sum(one.tried for one in found.values()) == len(killed.COMMANDS)
    assert sum(one.cut for one in found.values()) > 0
    assert {name: (one.lost, one.doubled, one.broken) for name, one in found.items()} == dict.fromkeys(
        found, (0, 0, [])
    )


@pytest.fixture
def engine_name() -> str:
    """Whoever tampers with a file or damages it does so past any server."""
    return "sqlite"


def test_every_tampering_is_found(lived_in: Lab, tmp_path: Path) -> None:
    tried, overlooked = tampering.missed(lived_in, 3 * len(tampering.KINDS), tmp_path)
    assert overlooked == []
    assert set(tried) == {kind.__name__ for kind in tampering.KINDS}


def test_a_damaged_file_is_named_or_says_what_it_said(lived_in: Lab, tmp_path: Path) -> None:
    outcomes, overlooked, shares = damage.run(lived_in, 40, tmp_path)
    assert overlooked == []
    assert outcomes["named"] > 10
    assert any(shares)


def test_of_a_damaged_file_every_row_is_saved_that_the_journal_tells_of(lived_in: Lab, tmp_path: Path) -> None:
    lived_in.amend("exposure", "1", {"duration_min": "3h"}, "typed wrong")
    lived_in.strike("cleaning", "1", "never happened")
    kept = lived_in.back_up(tmp_path / "kept")
    content = kept.path.read_bytes()
    damaged = tmp_path / "damaged.db"
    damaged.write_bytes(content.replace(b"straight", b"crooked!"))
    assert not open_lab(str(damaged)).verify().whole
    assert damage.saved(damaged, tmp_path / "saved.db") < kept.entries  # the journal's own entry holds the word too
    done = rescue(lived_in.record.name, str(tmp_path / "whole.db"))
    assert (done.entries, done.head, done.stopped) == (kept.entries, kept.head, "")
    saved = open_lab(str(tmp_path / "whole.db"))
    assert damage.rows(saved) == damage.rows(lived_in)


def test_hostile_input_is_refused_in_words_or_taken_whole(lived_in: Lab) -> None:
    found = fuzz.run(lambda path: open_lab(str(shutil.copy(lived_in.record.name, path))), 150)
    assert found.faults == []
    assert found.inputs.total() >= 150
    assert {0, 2} <= set(found.statuses)


# --- a server's own hard times ---------------------------------------------------------------------------------------


def test_a_record_comes_back_to_the_minute_before_an_accident(postgresql: str) -> None:
    """By a base backup and the log kept since, as the README says it."""
    if sys.platform == "win32":
        pytest.skip("the commands that keep the log are POSIX's")
    found = recovery.tried()
    assert found.at_backup < found.at_target < found.at_accident
    assert (found.found, found.whole) == (found.at_target, True)


def test_a_server_that_stops_under_its_writers_keeps_what_was_acknowledged(postgresql: str) -> None:
    found = restarts.run(2)
    assert (found.stops, found.lost, found.doubled, found.half, found.broken) == (2, 0, 0, 0, [])
    assert found.acknowledged > 0
    assert found.cut > 0


@pytest.mark.skipif(not full.may_mount(), reason="needs a file system of its own to fill")
def test_a_disk_that_is_really_full(postgresql: str) -> None:
    for found in (full.on_file(3), full.on_server(1)):
        assert found.refused > 0
        assert (found.lost, found.half, found.broken) == (0, 0, [])


def test_whoever_is_cut_off_or_killed_at_a_server_leaves_it_whole(postgresql: str) -> None:
    if sys.platform == "win32":
        pytest.skip("SIGKILL and fork are POSIX's")
    few = tuple(command for command in killed.COMMANDS if command.name in ("calibrate", "import"))
    for how in ("postgresql", "cut"):
        found = killed.run(1, how, seed=7, commands=few)
        assert {name: (one.tried, one.lost, one.doubled, one.broken) for name, one in found.items()} == dict.fromkeys(
            found, (1, 0, 0, [])
        )
