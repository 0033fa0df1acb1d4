"""Many at once: processes that log on one record as fast as they can, and readers that take their time.

python tests/faults/writers.py lab.db 32 100
python tests/faults/writers.py postgresql+psycopg://host/empty 64 100
"""

from __future__ import annotations

import subprocess
import sys
import time
from dataclasses import dataclass
from pathlib import Path

sys.path.insert(0, str(Path(__file__).resolve().parents[2]))

from electrolog.lab import open_lab, set_up

WRITER = """
import sys
from electrolog.lab import open_lab
lab, rig = open_lab(sys.argv[1]), int(sys.argv[2])
for number in range(int(sys.argv[3])):
    start = f"2026-02-{1 + rig % 28:02d}T{number // 60 % 24:02d}:{number % 60:02d}:{rig % 60:02d}Z"
    lab.log("inspections", ["SHARED"], {"at": start, "note": f"{rig}/{number}"})
"""
READER = """
import sys, time
from electrolog.lab import open_lab
lab = open_lab(sys.argv[1])
with lab.record.reading() as connection:
    before = connection.exec_driver_sql("SELECT count(*) FROM journal").scalar()
    time.sleep(float(sys.argv[2]))
    assert connection.exec_driver_sql("SELECT count(*) FROM journal").scalar() == before
"""


@dataclass(frozen=True)
class Outcome:
    entries: int
    lost: int
    doubled: int
    said: tuple[str, ...]
    whole: bool
    per_second: float

    def __str__(self) -> str:
        faults = f"lost {self.lost}, doubled {self.doubled}, errors shown {len(self.said)}"
        return (
            f"{self.entries} entries, {faults}, journal {'whole' if self.whole else 'BROKEN'}, {self.per_second:.0f}/s"
        )


def run(where: str, writers: int, entries: int, reader_s: float = 3.0) -> Outcome:
    set_up(where)
    lab = open_lab(where)
    lab.make_probes(["SHARED"])
    before, began = lab.verify().entries, time.perf_counter()
    each = str(entries)
    reader = started(READER, where, str(reader_s))
    rigs = [started(WRITER, where, str(rig), each) for rig in range(writers)]
    said = [program.communicate()[1].decode() for program in [*rigs, reader]]
    took = time.perf_counter() - began
    _, events = lab.life("SHARED")
    found = [event.row["note"] for event in events]
    wanted = {f"{rig}/{number}" for rig in range(writers) for number in range(entries)}
    verified = lab.verify()
    whole = verified.whole and verified.entries - before == len(wanted)
    lost, doubled = len(wanted - set(found)), len(found) - len(set(found))
    return Outcome(len(found), lost, doubled, tuple(text for text in said if text), whole, len(found) / took)


def started(code: str, *arguments: str) -> subprocess.Popen[bytes]:
    return subprocess.Popen([sys.executable, "-c", code, *arguments], stderr=subprocess.PIPE)


if __name__ == "__main__":
    print(run(sys.argv[1], int(sys.argv[2]), int(sys.argv[3])))
