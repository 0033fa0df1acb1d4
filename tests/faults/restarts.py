"""A server that is stopped in the middle of what its clients write, as by a power cut or an update, and started again.

    python tests/faults/restarts.py 20

What a client was told is there, is there; what was under way is there as a whole or not at all; whoever was cut off is
told so in words.
"""

from __future__ import annotations

import random
import subprocess
import sys
import time
from dataclasses import dataclass, field
from pathlib import Path

sys.path.insert(0, str(Path(__file__).resolve().parents[2]))

from electrolog.lab import open_lab
from tests.faults.servers import Server, server

WRITERS = 4
WRITER = """
import itertools, sys
from electrolog.errors import ElectrologError
from electrolog.lab import open_lab
try:
    lab = open_lab(sys.argv[1])
    for number in itertools.count():
        label = f"{sys.argv[2]}-{number:06d}"
        lab.make_probes([f"{label}-{one}" for one in range(5)])
        print(label, flush=True)
except ElectrologError as refused:
    print(refused.message, file=sys.stderr)
    sys.exit(refused.exit_code)
"""


@dataclass
class Outcome:
    """stops: of the server; acknowledged: entries, of five probes each; cut: clients that were told so."""

    stops: int = 0
    acknowledged: int = 0
    cut: int = 0
    lost: int = 0
    doubled: int = 0
    half: int = 0
    broken: list[str] = field(default_factory=list)


def stopped_once(one: Server, where: str, round_: int, chance: random.Random, out: Outcome) -> None:
    clients = [
        subprocess.Popen(
            [sys.executable, "-c", WRITER, where, f"{round_}-{rig}"],
            stdout=subprocess.PIPE,
            stderr=subprocess.PIPE,
            encoding="utf-8",
        )
        for rig in range(WRITERS)
    ]
    began = [client.stdout.readline() for client in clients if client.stdout is not None]
    time.sleep(chance.uniform(0.0, 0.5))
    one.stop("immediate" if round_ % 2 else "fast")
    said = [client.communicate(timeout=120) for client in clients]
    one.start()
    out.stops += 1
    acknowledged = [*began, *(line for printed, _ in said for line in printed.splitlines())]
    look(where, round_, {line.strip() for line in acknowledged}, out)
    for client, (_, complaint) in zip(clients, said, strict=True):
        out.cut += "was cut off" in complaint
        if client.returncode != 1 or len(complaint.splitlines()) != 1:
            out.broken.append(f"round {round_}: status {client.returncode}, {complaint[-300:]}")


def look(where: str, round_: int, acknowledged: set[str], out: Outcome) -> None:
    lab = open_lab(where)
    found = lab.verify()
    out.broken += [f"round {round_}: {fault}" for fault in found.faults]
    labels = [row["electrode"] for row in lab.rows("electrodes") if row["electrode"].startswith(f"{round_}-")]
    entries: dict[str, int] = {}
    for label in labels:
        entry = label.rpartition("-")[0]
        entries[entry] = entries.get(entry, 0) + 1
    out.acknowledged += len(acknowledged)
    out.lost += len(acknowledged - entries.keys())
    out.doubled += len(labels) - len(set(labels))
    out.half += sum(count != 5 for count in entries.values())


def run(stops: int, seed: int = 1) -> Outcome:
    chance, out = random.Random(seed), Outcome()  # noqa: S311 -- seeded, so that a failure can be had again
    with server() as one:
        where = one.new_record()
        for round_ in range(stops):
            stopped_once(one, where, round_, chance, out)
    return out


if __name__ == "__main__":
    print(run(int(sys.argv[1] if len(sys.argv) > 1 else 20)))
