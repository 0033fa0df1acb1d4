"""At the terminal: what a person waits for, beside the loading of the libraries that any such program needs."""

from __future__ import annotations

from collections.abc import Iterator
from datetime import UTC, datetime

from tests.bench import labs
from tests.bench.line import Aim, Family, Line, ratio
from tests.bench.timing import Taken, by_turns, python, typed

ROUNDS = 21  # each takes tenths of a second, and a shared machine hesitates for as long
FEW, MANY = 60, 10_000
TYPER, FLOOR = "import typer", "import typer, sqlalchemy, numpy"
POINTS = ("0:0.1", "0.25uM:4.4", "0.5uM:8.7", "1uM:17.3", "2uM:34.8")
NOW = datetime(2035, 1, 1, tzinfo=UTC)  # behind the last event of either lab


def helping() -> Iterator[Line]:
    file = labs.lab_file(FEW)
    completing = ("-m", "electrolog.cli.completing", "--db", file, "check")
    taken = by_turns(
        {
            TYPER: python("-c", TYPER),
            "help": typed("--help"),
            "label": python(*completing, "P0"),
            "option": python(*completing, "--wa"),
        },
        ROUNDS,
    )
    for name, work in (("help", "--help"), ("label", "completion of a label"), ("option", "completion of an option")):
        yield ratio(work, TYPER, taken[name], taken[TYPER], 1.5)


def logging() -> Iterator[Line]:
    file = labs.copied(labs.lab_file(FEW), "logged.db")
    # A moment of its own each time would be as good; the same again is one more calibration of the same minute.
    words = ("calibrate", labs.first_probe(file), "interim", "DA", *POINTS, "--waveform", labs.WAVEFORM, "--yes")
    taken = by_turns({FLOOR: python("-c", FLOOR), "calibrate": typed("--db", file, *words)}, ROUNDS)
    yield ratio("calibrate: five points, journalled, answered", FLOOR, taken["calibrate"], taken[FLOOR], 1.5)


def asking() -> Iterator[Line]:
    works = {FLOOR: python("-c", FLOOR)}
    for size in (FEW, MANY):
        file = labs.lab_file(size)
        probe = labs.first_probe(file)
        works[f"check {size}"] = typed("--db", file, "check", probe, *labs.RUN)
        works[f"history {size}"] = typed("--db", file, "history", probe)
    taken = by_turns(works, ROUNDS)
    for name in ("check", "history"):
        few, many = taken[f"{name} {FEW}"], taken[f"{name} {MANY}"]
        yield ratio(f"{name}: one probe of {FEW}, kept fit", FLOOR, few, taken[FLOOR], 1.7)
        yield ratio(f"{name}: one probe of {MANY}, kept fit", FLOOR, many, taken[FLOOR], 1.7)
        yield ratio(f"{name}: one probe of {MANY}", f"of {FEW}", many, few, 1.1)


def ranking() -> Iterator[Line]:
    """The first asks for all forecasts anew and keeps them; after that they are only read."""
    file = labs.lab_file(MANY)
    cache = {"ELECTROLOG_CACHE": str(labs.scratch() / "cache")}
    shelf = typed("--db", file, "shelf", *labs.RUN, "--json", more=cache)
    taken = by_turns({FLOOR: python("-c", FLOOR), "shelf": shelf})
    yield _beyond(f"shelf of {MANY} probes with verdicts, forecasts kept", taken["shelf"], taken[FLOOR])


def _beyond(work: str, ours: Taken, floor: Taken) -> Line:
    return Line(work, FLOOR, ours, floor, ours.median_s - floor.median_s, Aim(2.0, "s beyond"))


FAMILIES = (
    Family("help", helping),
    Family("calibrate", logging),
    Family("check", asking, heavy=True),
    Family("shelf", ranking, heavy=True),
)
