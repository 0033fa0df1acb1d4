"""Every command that writes, as somebody would type it in round `number`, and how often its event is then there."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from functools import cache
from pathlib import Path

import numpy as np
from sqlalchemy import text

from electrolog.errors import RecordError
from electrolog.lab import Lab, open_lab
from electrolog.measure.version import METHOD
from tests.measure import recordings

DAY = "2026-02-{:02d}T{:02d}:{:02d}Z"
PROBE = "K-{:04d}"
RIGHT = ("0.25uM", "0.5uM", "1uM", "2uM")
POINTS = ((0.0, 0.1), (0.5, 6.1), (1.0, 12.2), (2.0, 24.0))


@dataclass(frozen=True)
class Place:
    """where: the record; folder: for files; new: the name of a place, still empty, for another record."""

    where: str
    folder: Path
    new: Callable[[str], str]


Done = Callable[[Lab, Place, int], int]


@dataclass(frozen=True)
class Command:
    """done: how often the event is in the record (1 where it is whole; AssertionError where it is half).

    once: given twice it is refused, or changes nothing. before: what a round needs. since: the kills fall after that
    share of the time that it takes, for one that works long before it writes.
    """

    name: str
    words: Callable[[Place, int], list[str]]
    done: Done
    once: bool = True
    before: Callable[[Lab], None] | None = None
    since: float = 0.0


def at(number: int) -> str:
    return DAY.format(1 + number // 1440 % 28, number // 60 % 24, number % 60)


def prepare(lab: Lab, rounds: int) -> None:
    lab.make_probes(["K", "KN"], batch={"batch": "KB"})
    numbers = range(rounds)
    lab.make_probes([f"R-{number:04d}" for number in numbers] + [f"Z-{number:04d}" for number in numbers])
    lab.make_probes([f"F-{number}" for number in range(4)])
    for day, left in enumerate((1.0, 0.85, 0.7), start=5):
        for number in range(4):
            made = [(c, i * left * (1 + number / 20)) for c, i in POINTS]
            words = {
                "stage": "pre",
                "analyte": "serotonin",
                "waveform": "triangle",
                "at": f"2026-01-{day:02d}T0{number}:00Z",
            }
            lab.calibrate([new_calibration({"electrode": f"F-{number}", **words}, made)])
            run = {"start": f"2026-01-{day:02d}T09:00Z", "duration_min": "2h", "setting": "in-vivo"}
            lab.log("exposures", [f"F-{number}"], run)


def new_calibration(values: dict[str, str], points: list[tuple[float, float]]) -> object:
    from electrolog.answers.calibrating import NewCalibration

    return NewCalibration(values, tuple(points))


def event(name: str, sheet: str, *more: str, column: str = "at") -> Command:
    def count(lab: Lab, _: Place, number: int) -> int:
        moment = lab.moment(at(number))
        return sum(row[column] == moment for row in lab.rows(sheet) if row["electrode"] == "K")

    option = "--start" if column == "start" else "--at"
    return Command(name, lambda _, number: [name, "K", *more, option, at(number), "--yes"], count)


def named(sheet: str, column: str, name: str) -> Done:
    return lambda lab, _, number: sum(row[column] == name.format(number) for row in lab.rows(sheet))


def remarks(lab: Lab, _: Place, number: int) -> int:
    moment = lab.moment(at(number))
    return sum(row["at"] == moment for row in lab.rows("inspections") if row["electrode"] == "KN")


def noted(action: str) -> Done:
    return lambda lab, _, number: sum(entry.reason == f"{action} {number}" for entry in lab.journal())


# --- calibrations -------------------------------------------------------------------------------------------------


def calibrating(number: int, name: str) -> list[str]:
    return ["-w", "triangle", "--at", at(number), "--label", f"{name}-{number}", "--yes"]


def words_calibrate(_: Place, number: int) -> list[str]:
    return ["calibrate", "K", "pre", "DA", *(f"{c}uM:{i}" for c, i in POINTS), *calibrating(number, "KC")]


def words_trace(place: Place, number: int) -> list[str]:
    return ["trace", "K", "pre", "DA", recording(place.folder), *RIGHT, *calibrating(number, "KT")]


def words_scans(place: Place, number: int) -> list[str]:
    return ["scans", "K", "pre", "DA", scan_sheet(place.folder), *RIGHT, *calibrating(number, "KS")]


@cache
def recording(folder: Path) -> str:
    time, current, _ = recordings.trace()
    np.save(folder / "trace.npy", np.column_stack([time, current]))
    return str(folder / "trace.npy")


@cache
def scan_sheet(folder: Path) -> str:
    np.save(folder / "scans.npy", recordings.sheet(seconds=180, points=100)[0])
    return str(folder / "scans.npy")


def whole_calibrations(name: str) -> Done:
    def count(lab: Lab, _: Place, number: int) -> int:
        found = [one for one in lab.readings(["K"]) if one.calibration == f"{name}-{number}"]
        assert all(one.figures.n_points == 4 for one in found), "a calibration without all of its points"
        return len(found)

    return count


# --- many rows at once ----------------------------------------------------------------------------------------------


def words_import(place: Place, number: int) -> list[str]:
    """Twenty probes and as many exposures: a transaction of some length."""
    folder = place.folder / f"import-{number}"
    folder.mkdir(exist_ok=True)
    labels = [f"I{number}-{one}" for one in range(20)]
    (folder / "electrodes.csv").write_text("electrode\n" + "".join(f"{one}\n" for one in labels), encoding="utf-8")
    lines = [f"{one},{at(number)},60,in-vivo\n" for one in labels]
    text_ = "electrode,start,duration_min,setting\n" + "".join(lines)
    (folder / "exposures.csv").write_text(text_, encoding="utf-8")
    return ["import", str(folder)]


def words_adopt(place: Place, number: int) -> list[str]:
    book = place.folder / f"book-{number}.csv"
    lines = [f"A{number:04d}-{one:02d},2024-03-04,pre,{10 + one / 10},from a book\n" for one in range(20)]
    book.write_text("probe,date,stage,nA/uM,note\n" + "".join(lines), encoding="utf-8")
    return ["adopt", str(book), "--answer", "waveform=triangle", "--answer", "analyte=DA", "--commit"]


def twenty_and(sheet: str, prefix: str) -> Done:
    def count(lab: Lab, _: Place, number: int) -> int:
        own = prefix.format(number)
        probes = sum(row["electrode"].startswith(own) for row in lab.rows("electrodes"))
        events = sum(row["electrode"].startswith(own) for row in lab.rows(sheet))
        assert (probes, events) in ((0, 0), (20, 20)), f"half of it: {probes} probes, {events} {sheet}"
        return probes // 20

    return count


# --- derived figures ------------------------------------------------------------------------------------------------


def outdate_figures(lab: Lab) -> None:
    with lab.record.changing() as connection:
        connection.execute(text("UPDATE calibration_figures SET method = 'before'"))


def recomputed(lab: Lab, *_: object) -> int:
    with lab.record.reading() as connection:
        methods = set(connection.execute(text("SELECT DISTINCT method FROM calibration_figures")).scalars())
    assert methods in ({"before"}, {METHOD}), f"figures of both methods: {methods}"
    return int(methods == {METHOD})


def forget_fit(lab: Lab) -> None:
    with lab.record.changing() as connection:
        connection.execute(text("DELETE FROM kept_fits"))


def kept_fits(lab: Lab, *_: object) -> int:
    from electrolog.fouling.kept import from_dict
    from electrolog.record import kept_fits
    from electrolog.record.names import Names

    with lab.record.reading() as connection:
        analyte_id = Names(connection).row_id("analytes", "serotonin")
        found = kept_fits.kept_fit(connection, analyte_id)
        return 0 if found is None or from_dict(kept_fits.content(connection, analyte_id)) is None else 1


# --- whole records --------------------------------------------------------------------------------------------------


def backups(lab: Lab, place: Place, number: int) -> int:
    found = list((place.folder / f"b-{number}").glob("electrolog-*.db"))
    assert all(open_lab(str(path)).verify().whole for path in found), "a backup that is not whole"
    return len(found)


def records(name: str, *, file: bool = False) -> Done:
    """A whole record of that name, or none: what is half made is no record yet."""

    def count(_: Lab, place: Place, number: int) -> int:
        label = name.format(number)
        try:
            other = open_lab(str(place.folder / f"{label}.db") if file else place.new(label))
        except RecordError:
            return 0
        found = other.verify()
        assert found.whole, f"{label} is not whole"
        return int(found.entries > 0)

    return count


def words_restore(place: Place, number: int) -> list[str]:
    (saved,) = place.folder.glob("saved/electrolog-*.db")
    return ["--db", place.new(f"r_{number}"), "restore", str(saved)]


COMMANDS = (
    Command("new", lambda _, n: ["new", PROBE.format(n)], named("electrodes", "electrode", PROBE)),
    event("coat", "coatings", "-m", "PFSA"),
    event("condition", "conditionings", "--for", "20min", "-w", "triangle"),
    Command("calibrate", words_calibrate, whole_calibrations("KC")),
    Command("trace", words_trace, whole_calibrations("KT")),
    Command("scans", words_scans, whole_calibrations("KS")),
    event("expose", "exposures", "--for", "1h", "-s", "in-vivo", column="start"),
    event("clean", "cleanings", "-m", "isopropanol"),
    event("recut", "recuts", "--length", "75um"),
    event("inspect", "inspections", "--noise", "80pA"),
    Command("note", lambda _, n: ["note", "KN", "straight", "--at", at(n)], remarks),
    Command(
        "retire",
        lambda _, n: ["retire", f"R-{n:04d}", "-r", "broken", "--at", at(n), "--yes"],
        named("retirements", "electrode", "R-{:04d}"),
    ),
    Command(
        "standard",
        lambda _, n: ["standard", f"S-{n}", "dopamine", "10mM", "--prepared", "2026-01-07T08:00Z"],
        named("standards", "standard", "S-{}"),
    ),
    Command("add", lambda _, n: ["add", "setting", f"phantom {n}"], named("terms", "term", "phantom {}")),
    Command(
        "limits",
        lambda _, n: ["limits", "set", "accepted-risk", "5%", "--project", f"P{n}"],
        named("limits", "project", "P{}"),
        once=False,
    ),
    Command(
        "amend", lambda _, n: ["amend", "batch", "KB", f"note=n{n}", "--why", f"amend {n}", "--yes"], noted("amend")
    ),
    Command("strike", lambda _, n: ["strike", "probe", f"Z-{n:04d}", "--why", f"strike {n}"], noted("strike")),
    Command("import", words_import, twenty_and("exposures", "I{}-")),
    Command("adopt", words_adopt, twenty_and("calibrations", "A{:04d}-")),
    Command("recompute", lambda *_: ["recompute"], recomputed, before=outdate_figures),
    Command("fit", lambda *_: ["fit", "-a", "serotonin", "--fresh"], kept_fits, before=forget_fit, since=0.7),
    Command("backup", lambda place, n: ["backup", str(place.folder / f"b-{n}")], backups),
    Command("move", lambda place, n: ["move", str(place.folder / f"m_{n}.db")], records("m_{}", file=True)),
    Command("restore", words_restore, records("r_{}")),
    Command("setup", lambda place, n: ["--db", place.new(f"s_{n}"), "setup"], records("s_{}")),
)
