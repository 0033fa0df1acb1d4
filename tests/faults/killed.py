"""Killed at any moment: every command that writes, again and again, ended by SIGKILL; then what is left is looked at.

    python tests/faults/killed.py 600
    python tests/faults/killed.py 150 postgresql     # the client is killed
    python tests/faults/killed.py 150 cut            # the server ends the session

After each kill the record must verify; every event is there whole or not at all; whatever was acknowledged on standard
output is there; the same command given again must leave the event exactly once. Whose session is cut off is told so.
"""

from __future__ import annotations

import random
import sys
import tempfile
import time
from collections import Counter
from collections.abc import Callable, Iterator
from contextlib import ExitStack, contextmanager
from dataclasses import dataclass, field
from functools import cache
from pathlib import Path

from sqlalchemy import make_url

sys.path.insert(0, str(Path(__file__).resolve().parents[2]))

from electrolog.lab import Lab, open_lab, set_up
from tests.faults.commands import COMMANDS, Command, Place, prepare
from tests.faults.servers import Server, server
from tests.faults.zygote import Ended, Zygote


@dataclass
class Tally:
    tried: int = 0
    cut: int = 0  # so many were ended before they had finished
    absent: int = 0
    lost: int = 0
    doubled: int = 0
    broken: list[str] = field(default_factory=list)


Ending = Callable[[list[str], float], Ended]


def argv(place: Place, command: Command, number: int) -> list[str]:
    return ["--db", place.where, *command.words(place, number)]


def end_once(zygote: Zygote, ending: Ending, place: Place, command: Command, number: int, after_s: float) -> Tally:
    tally = Tally(tried=1)
    lab = open_lab(place.where, who="wren")
    if command.before is not None:
        command.before(lab)
    ended = ending(argv(place, command, number), after_s)
    was_cut = ended.status == 1 and "was cut off" in ended.err
    tally.cut += ended.status < 0 or was_cut
    if ended.status > 0 and not was_cut:
        tally.broken.append(f"{command.name} {number}: {ended.err}")
    look(zygote, place, command, number, ended.status == 0 or bool(ended.out.strip()), tally)
    return tally


def look(zygote: Zygote, place: Place, command: Command, number: int, acknowledged: bool, tally: Tally) -> None:
    lab = open_lab(place.where, who="wren")
    try:
        count = command.done(lab, place, number)
        found = lab.verify()
        assert found.whole, found.faults[0]
        tally.absent += count == 0
        tally.lost += acknowledged and count == 0
        if count == 0 or command.once:
            zygote.run(argv(place, command, number))
        count = command.done(lab, place, number)
        tally.lost += count == 0
        tally.doubled += count > 1
    except AssertionError as why:
        tally.broken.append(f"{command.name} {number}: {why}")


def time_of(zygote: Zygote, place: Place, command: Command, number: int) -> float:
    """How long the command takes when nobody ends it: the kill falls anywhere in that."""
    done = zygote.run(argv(place, command, number))
    assert done.status == 0, f"{command.name}: {done.err}"
    return done.took_s


@contextmanager
def a_file() -> Iterator[tuple[Place, None]]:
    with tempfile.TemporaryDirectory(prefix="electrolog-killed-", ignore_cleanup_errors=True) as name:
        folder = Path(name)
        yield Place(str(folder / "record.db"), folder, lambda label: str(folder / f"{label}.db")), None


@contextmanager
def a_server() -> Iterator[tuple[Place, Server]]:
    with server() as one, tempfile.TemporaryDirectory(prefix="electrolog-killed-") as name:

        @cache
        def new(label: str) -> str:
            one.run(f"CREATE DATABASE {label}")
            return one.url(label)

        yield Place(new("lab"), Path(name), new), one


def cutting(zygote: Zygote, one: Server) -> Ending:
    """The server ends the client's sessions, in whatever database they are."""

    def ending(words: list[str], after_s: float) -> Ended:
        databases = {str(make_url(word).database) for word in words if "://" in word}

        def cut() -> None:
            time.sleep(after_s)
            for database in databases:
                one.cut_off(database)

        return zygote.run(words, meanwhile=cut)

    return ending


def run(
    rounds_each: int, how: str = "sqlite", seed: int = 1, commands: tuple[Command, ...] = COMMANDS
) -> dict[str, Tally]:
    """Ends each command so many times, at moments spread evenly over the time that it takes."""
    chance = random.Random(seed)  # noqa: S311 -- seeded, so that a failure can be had again
    tallies = {command.name: Tally() for command in commands}
    with ExitStack() as stack:
        place, one = stack.enter_context(a_file() if how == "sqlite" else a_server())
        zygote = Zygote()
        stack.callback(zygote.close)
        prepared(place, rounds_each + 1)
        ending: Ending = zygote.run if how != "cut" or one is None else cutting(zygote, one)
        for command in commands:
            usual = time_of(zygote, place, command, rounds_each)
            for number in range(rounds_each):
                after_s = usual * chance.uniform(command.since, 1.2)
                add(tallies[command.name], end_once(zygote, ending, place, command, number, after_s))
    return tallies


def prepared(place: Place, rounds: int) -> None:
    set_up(place.where)
    lab: Lab = open_lab(place.where, who=None if "://" in place.where else "wren")
    prepare(lab, rounds)
    lab.back_up(place.folder / "saved")


def add(sums: Tally, one: Tally) -> None:
    for name in ("tried", "cut", "absent", "lost", "doubled"):
        setattr(sums, name, getattr(sums, name) + getattr(one, name))
    sums.broken += one.broken


def table(tallies: dict[str, Tally]) -> str:
    rows = [("command", "tried", "cut", "absent", "lost", "doubled", "broken")]
    rows += [
        (name, *map(str, (one.tried, one.cut, one.absent, one.lost, one.doubled, len(one.broken))))
        for name, one in tallies.items()
    ]
    sums = Counter[int]()
    for row in rows[1:]:
        sums.update({place: int(cell) for place, cell in enumerate(row[1:], start=1)})
    rows.append(("all", *(str(sums[place]) for place in range(1, 7))))
    return "\n".join("  ".join(cell.rjust(9) for cell in row) for row in rows)


if __name__ == "__main__":
    each = -(-int(sys.argv[1] if len(sys.argv) > 1 else 600) // len(COMMANDS))
    found = run(each, sys.argv[2] if len(sys.argv) > 2 else "sqlite")
    print(table(found))
    print("\n".join(fault for one in found.values() for fault in one.broken))
