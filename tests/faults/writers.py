"""Many at once: processes that log on one record as fast as they can, beside a reader that looks all the while.

python tests/faults/writers.py lab.db 32 100
python tests/faults/writers.py postgresql 64 100                             # on a server of its own
python tests/faults/writers.py postgresql+psycopg://host/empty 64 100
"""

from __future__ import annotations

import os
import subprocess
import sys
import time
from dataclasses import dataclass
from pathlib import Path

sys.path.insert(0, str(Path(__file__).resolve().parents[2]))

from electrolog.lab import open_lab, set_up
from tests.faults.servers import server

WRITER = """
import sys
from electrolog.lab import open_lab
lab, rig = open_lab(sys.argv[1]), int(sys.argv[2])
for number in range(int(sys.argv[3])):
    start = f"2026-02-{1 + rig % 28:02d}T{number // 60 % 24:02d}:{number % 60:02d}:{rig % 60:02d}Z"
    lab.log("inspections", [f"R{rig}"], {"at": start, "note": f"{rig}/{number}"})
"""
READER = """
import sys
from electrolog.lab import open_lab
lab = open_lab(sys.argv[1])
with lab.record.reading() as connection:
    before = connection.exec_driver_sql("SELECT count(*) FROM journal").scalar()
    print("looking", flush=True)
    sys.stdin.read()
    assert connection.exec_driver_sql("SELECT count(*) FROM journal").scalar() == before, "the reader saw another state"
"""


@dataclass(frozen=True)
class Outcome:
    """cpu_ms: what an entry cost the writers, their start included; on a machine with other work this holds still."""

    entries: int
    lost: int
    doubled: int
    said: tuple[str, ...]
    whole: bool
    per_second: float
    cpu_ms: float

    def __str__(self) -> str:
        faults = f"lost {self.lost}, doubled {self.doubled}, errors shown {len(self.said)}"
        journal = f"journal {'whole' if self.whole else 'BROKEN'}"
        return f"{self.entries} entries, {faults}, {journal}, {self.per_second:.0f}/s, {self.cpu_ms:.1f} ms of CPU each"


def run(where: str, writers: int, entries: int) -> Outcome:
    set_up(where)
    lab = open_lab(where)
    # A probe for each rig: a life of thousands of entries would take longer to read than an entry does to write.
    probes = lab.make_probes([f"R{rig}" for rig in range(writers)])
    reader = started(READER, where)
    assert reader.stdout is not None
    assert reader.stdout.readline().strip() == b"looking"
    before, began, used = lab.verify().entries, time.perf_counter(), cpu_of_children_s()
    rigs = [started(WRITER, where, str(rig), str(entries)) for rig in range(writers)]
    said = [program.communicate()[1].decode() for program in rigs]
    took, used = time.perf_counter() - began, cpu_of_children_s() - used
    said.append(reader.communicate()[1].decode())
    found = [event.row["note"] for probe in probes for event in lab.life(probe)[1]]
    wanted = {f"{rig}/{number}" for rig in range(writers) for number in range(entries)}
    verified = lab.verify()
    whole = verified.whole and verified.entries - before == len(wanted)
    lost, doubled = len(wanted - set(found)), len(found) - len(set(found))
    shown = tuple(text for text in said if text)
    return Outcome(len(found), lost, doubled, shown, whole, len(found) / took, 1000 * used / len(wanted))


def cpu_of_children_s() -> float:
    times = os.times()
    return times.children_user + times.children_system


def started(code: str, *arguments: str) -> subprocess.Popen[bytes]:
    pipe = subprocess.PIPE
    return subprocess.Popen([sys.executable, "-c", code, *arguments], stdin=pipe, stdout=pipe, stderr=pipe)


if __name__ == "__main__":
    place, writers, entries = sys.argv[1], int(sys.argv[2]), int(sys.argv[3])
    if place == "postgresql":
        with server("max_connections = 200") as one:
            print(run(one.url(one.new_database()), writers, entries))
    else:
        print(run(place, writers, entries))
