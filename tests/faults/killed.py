"""Killed at any moment: every command that writes, again and again, ended by SIGKILL; then what is left is looked at.

    python tests/faults/killed.py 600

After each kill the record must verify; every event is there whole or not at all; whatever was acknowledged on standard
output is there; the same command given again must leave the event exactly once.
"""

from __future__ import annotations

import random
import shutil
import sys
import tempfile
from collections import Counter
from collections.abc import Callable
from dataclasses import dataclass, field
from pathlib import Path

sys.path.insert(0, str(Path(__file__).resolve().parents[2]))

from electrolog.errors import RecordError
from electrolog.lab import Lab, open_lab, set_up
from tests.faults.zygote import Zygote

DAY = "2026-02-{:02d}T{:02d}:{:02d}Z"
PROBE = "K-{:04d}"


@dataclass(frozen=True)
class Command:
    """words: what is typed in round `number`; done: how often its event is in the record (1 where it is whole)."""

    name: str
    words: Callable[[int, Path], list[str]]
    done: Callable[[Lab, int], int]
    once: bool = True  # given twice it is refused, or changes nothing


@dataclass
class Tally:
    tried: int = 0
    cut: int = 0  # so many were ended before they had finished
    absent: int = 0
    lost: int = 0
    doubled: int = 0
    broken: list[str] = field(default_factory=list)


def at(number: int) -> str:
    return DAY.format(1 + number // 1440 % 28, number // 60 % 24, number % 60)


def events_at(sheet: str, column: str = "at") -> Callable[[Lab, int], int]:
    def count(lab: Lab, number: int) -> int:
        moment = lab.moment(at(number))
        return sum(row[column] == moment for row in lab.rows(sheet) if row["electrode"] == "K")

    return count


def remarks(lab: Lab, number: int) -> int:
    moment = lab.moment(at(number))
    return sum(row["at"] == moment for row in lab.rows("inspections") if row["electrode"] == "KN")


def beside(lab: Lab, name: str) -> Path:
    return Path(lab.record.name).parent / name


def backups(lab: Lab, number: int) -> int:
    found = list(beside(lab, f"b-{number}").glob("electrolog-*.db"))
    assert all(open_lab(str(path)).verify().whole for path in found), "a backup that is not whole"
    return len(found)


def records(name: str) -> Callable[[Lab, int], int]:
    """A whole record of that name, or none: what is half made is no record yet."""

    def count(lab: Lab, number: int) -> int:
        path = beside(lab, name.format(number))
        try:
            other = open_lab(str(path))
        except RecordError:
            return 0
        assert other.verify().whole, f"{path.name} is not whole"
        return 1

    return count


def whole_calibrations(lab: Lab, number: int) -> int:
    found = [one for one in lab.readings(["K"]) if one.calibration == f"KC-{number}"]
    assert all(one.figures.n_points == 4 for one in found), "a calibration without all of its points"
    return len(found)


def noted(action: str) -> Callable[[Lab, int], int]:
    return lambda lab, number: sum(entry.reason == f"{action} {number}" for entry in lab.journal())


def event(name: str, sheet: str, *more: str, column: str = "at") -> Command:
    option = "--start" if column == "start" else "--at"
    return Command(name, lambda n, _: [name, "K", *more, option, at(n)], events_at(sheet, column))


def write_folder(number: int, folder: Path) -> list[str]:
    """Twenty probes and as many exposures: a transaction of some length."""
    place = folder / f"import-{number}"
    place.mkdir(exist_ok=True)
    labels = [f"I{number}-{one}" for one in range(20)]
    (place / "electrodes.csv").write_text("electrode\n" + "".join(f"{one}\n" for one in labels), encoding="utf-8")
    lines = [f"{one},{at(number)},60,in-vivo\n" for one in labels]
    text = "electrode,start,duration_min,setting\n" + "".join(lines)
    (place / "exposures.csv").write_text(text, encoding="utf-8")
    return ["import", str(place)]


def imported(lab: Lab, number: int) -> int:
    probes = sum(row["electrode"].startswith(f"I{number}-") for row in lab.rows("electrodes"))
    runs = sum(row["electrode"].startswith(f"I{number}-") for row in lab.rows("exposures"))
    assert (probes, runs) in ((0, 0), (20, 20)), f"half an import: {probes} probes, {runs} exposures"
    return probes // 20


def words_calibrate(number: int, _: Path) -> list[str]:
    points = ["0uM:0.1", "0.5uM:6.1", "1uM:12.2", "2uM:24"]
    return ["calibrate", "K", "pre", "DA", *points, "-w", "triangle", "--at", at(number), "--label", f"KC-{number}"]


def words_standard(number: int, _: Path) -> list[str]:
    return ["standard", f"S-{number}", "dopamine", "10mM", "--prepared", "2026-01-07T08:00Z"]


def named(sheet: str, column: str, name: str) -> Callable[[Lab, int], int]:
    return lambda lab, number: sum(row[column] == name.format(number) for row in lab.rows(sheet))


def retired(lab: Lab, number: int) -> int:
    return sum(row["electrode"] == f"R-{number:04d}" for row in lab.rows("retirements"))


def restoring(number: int, folder: Path) -> list[str]:
    (saved,) = folder.glob("saved/electrolog-*.db")
    return ["--db", str(folder / f"r-{number}.db"), "restore", str(saved)]


COMMANDS = (
    Command("new", lambda n, _: ["new", PROBE.format(n)], named("electrodes", "electrode", PROBE)),
    event("coat", "coatings", "-m", "PFSA"),
    event("condition", "conditionings", "--for", "20min", "-w", "triangle"),
    Command("calibrate", words_calibrate, whole_calibrations),
    event("expose", "exposures", "--for", "1h", "-s", "in-vivo", column="start"),
    event("clean", "cleanings", "-m", "isopropanol"),
    event("recut", "recuts", "--length", "75um"),
    event("inspect", "inspections", "--noise", "80pA"),
    Command("note", lambda n, _: ["note", "KN", "straight", "--at", at(n)], remarks),
    Command("retire", lambda n, _: ["retire", f"R-{n:04d}", "-r", "broken", "--at", at(n)], retired),
    Command("standard", words_standard, named("standards", "standard", "S-{}")),
    Command("add", lambda n, _: ["add", "setting", f"phantom {n}"], named("terms", "term", "phantom {}")),
    Command(
        "limits",
        lambda n, _: ["limits", "set", "accepted-risk", "5%", "--project", f"P{n}"],
        named("limits", "project", "P{}"),
        once=False,
    ),
    Command("amend", lambda n, _: ["amend", "batch", "KB", f"note=n{n}", "--why", f"amend {n}"], noted("amend")),
    Command("strike", lambda n, _: ["strike", "probe", f"Z-{n:04d}", "--why", f"strike {n}"], noted("strike")),
    Command("import", write_folder, imported),
    Command("backup", lambda n, folder: ["backup", str(folder / f"b-{n}")], backups),
    Command("move", lambda n, folder: ["move", str(folder / f"m-{n}.db")], records("m-{}.db")),
    Command("restore", restoring, records("r-{}.db")),
    Command("setup", lambda n, folder: ["--db", str(folder / f"s-{n}.db"), "setup"], records("s-{}.db")),
)


def prepared(folder: Path, rounds: int) -> Path:
    path = folder / "record.db"
    set_up(str(path))
    lab = open_lab(str(path), who="wren")
    lab.make_probes(["K", "KN"], batch={"batch": "KB"})
    numbers = range(rounds)
    lab.make_probes([f"R-{number:04d}" for number in numbers] + [f"Z-{number:04d}" for number in numbers])
    lab.back_up(folder / "saved")
    return path


def argv(path: Path, command: Command, number: int) -> list[str]:
    words = command.words(number, path.parent)
    return ["--db", str(path), *words, *(["--yes"] if takes_yes(command) else [])]


def takes_yes(command: Command) -> bool:
    return command.name in ("calibrate", "expose", "coat", "condition", "clean", "recut", "inspect", "retire", "amend")


def kill_once(zygote: Zygote, path: Path, command: Command, number: int, after_s: float, tally: Tally) -> None:
    tally.tried += 1
    ended = zygote.run(argv(path, command, number), after_s)
    tally.cut += ended.status < 0
    if ended.status > 0:
        tally.broken.append(f"{command.name} {number}: {ended.err}")
    look(zygote, path, command, number, bool(ended.out.strip()), tally)


def look(zygote: Zygote, path: Path, command: Command, number: int, acknowledged: bool, tally: Tally) -> None:
    lab = open_lab(str(path), who="wren")
    try:
        count = command.done(lab, number)
        found = lab.verify()
        assert found.whole, found.faults[0]
        tally.absent += count == 0
        tally.lost += acknowledged and count == 0
        if count == 0 or command.once:
            zygote.run(argv(path, command, number))
        count = command.done(lab, number)
        tally.lost += count == 0
        tally.doubled += count > 1
    except AssertionError as why:
        tally.broken.append(f"{command.name} {number}: {why}")


def time_of(zygote: Zygote, path: Path, command: Command, number: int) -> float:
    """How long the command takes when nobody ends it: the kill falls anywhere in that."""
    done = zygote.run(argv(path, command, number))
    assert done.status == 0, f"{command.name}: {done.err}"
    return done.took_s


def run(rounds_each: int, seed: int = 1, commands: tuple[Command, ...] = COMMANDS) -> dict[str, Tally]:
    """Kills each command so many times, at moments spread evenly over the time that it takes."""
    zygote = Zygote()
    chance = random.Random(seed)  # noqa: S311 -- seeded, so that a failure can be had again
    tallies = {command.name: Tally() for command in commands}
    folder = Path(tempfile.mkdtemp(prefix="electrolog-killed-"))
    try:
        path = prepared(folder, rounds_each + 1)
        for command in commands:
            usual = time_of(zygote, path, command, rounds_each)
            for number in range(rounds_each):
                kill_once(zygote, path, command, number, usual * chance.uniform(0.0, 1.2), tallies[command.name])
    finally:
        zygote.close()
        shutil.rmtree(folder, ignore_errors=True)
    return tallies


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
    found = run(each)
    print(table(found))
    print("\n".join(fault for one in found.values() for fault in one.broken))
