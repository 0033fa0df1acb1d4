"""Several rigs at once: no entry is lost, and the chain holds."""

from __future__ import annotations

import subprocess
import sys

import pytest

from electrolog.lab import Lab, open_lab
from electrolog.record.builtin import ANALYTES
from tests.faults import writers

PROCESSES, ENTRIES = 8, 25
RIG = """
import sys
from electrolog.lab import open_lab
lab, rig = open_lab(sys.argv[1], who=f"rig{sys.argv[2]}"), int(sys.argv[2])
for number in range(int(sys.argv[3])):
    start = f"2026-02-01T{number // 60:02d}:{number % 60:02d}:{rig:02d}Z"
    lab.log("inspections", ["B1-02"], {"at": start, "note": f"{rig}/{number}"})
"""


def test_eight_rigs_lose_nothing(lived_in: Lab) -> None:
    before = lived_in.verify().entries
    where = lived_in.record.engine.url.render_as_string(False)
    rigs = [
        subprocess.Popen([sys.executable, "-c", RIG, where, str(rig), str(ENTRIES)], stderr=subprocess.PIPE)
        for rig in range(PROCESSES)
    ]
    said = [rig.communicate(timeout=300)[1] for rig in rigs]
    assert said == [b""] * PROCESSES
    assert [rig.returncode for rig in rigs] == [0] * PROCESSES
    _, events = lived_in.life("B1-02")
    assert {e.row["note"] for e in events} == {f"{rig}/{n}" for rig in range(PROCESSES) for n in range(ENTRIES)}
    found = lived_in.verify()
    assert found.whole
    assert found.entries == before + PROCESSES * ENTRIES


def test_two_rigs_making_one_probe_make_it_once(lived_in: Lab) -> None:
    code = "import sys; from electrolog.lab import open_lab; open_lab(sys.argv[1]).make_probes(['SAME'])"
    where = lived_in.record.engine.url.render_as_string(False)
    rigs = [subprocess.Popen([sys.executable, "-c", code, where], stderr=subprocess.PIPE) for _ in range(4)]
    said = [rig.communicate(timeout=120)[1].decode() for rig in rigs]
    assert sorted(rig.returncode for rig in rigs) == [0, 1, 1, 1]
    assert sum("is there already" in text for text in said) == 3
    assert lived_in.verify().whole


def test_three_at_once_make_one_record(blank: str) -> None:
    code = "import sys; from electrolog.lab import open_lab; open_lab(sys.argv[1], create=True).rows('analytes')"
    rigs = [subprocess.Popen([sys.executable, "-c", code, blank], stderr=subprocess.PIPE) for _ in range(3)]
    said = [rig.communicate(timeout=120)[1].decode() for rig in rigs]
    assert [rig.returncode for rig in rigs] == [0, 0, 0], said
    lab = open_lab(blank)
    assert lab.verify().whole
    assert len(lab.rows("analytes")) == len(ANALYTES)


@pytest.mark.parametrize("reader_sees", ["before", "after"])
def test_a_reader_sees_all_of_an_entry_or_nothing(lived_in: Lab, reader_sees: str) -> None:
    with lived_in.record.writing() as writer:
        from electrolog.record import entry, sheets

        entry.add(writer, sheets.ELECTRODES, {"electrode": "NEW"})
        writer.flush()
        if reader_sees == "before":
            assert "NEW" not in {row["electrode"] for row in lived_in.rows("electrodes")}
    assert "NEW" in {row["electrode"] for row in lived_in.rows("electrodes")}


def test_many_writers_and_a_slow_reader(blank: str) -> None:
    """Few of what tests/faults/writers.py does; the reader sees one state as long as it looks, and holds up nobody."""
    found = writers.run(blank, 6, 10)
    assert (found.entries, found.lost, found.doubled, found.said, found.whole) == (60, 0, 0, (), True)
