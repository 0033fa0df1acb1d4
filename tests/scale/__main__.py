"""One probe of very many asked about, beside one of a small record; and what a question reads of the database.

    python -m tests.scale lab FILE PROBES           a lab's record, to be copied or to stand beside
    python -m tests.scale fill WHERE FILE LABS      so many copies of it in one record, a file or a server's
    python -m tests.scale ask WHERE SMALL           the same questions of both, in turn
    python -m tests.scale gather WHERE LAB          one cohort read for its fit: time and peak memory

`WHERE` and `SMALL` are records as --db takes them, their questions asked of the last lab. History also tells what was
measured on the same days; so the two probes are chosen to have had as many calibrations beside their own.
"""

from __future__ import annotations

import sys
import time
from collections.abc import Callable, Mapping, Sequence
from functools import cache, partial
from pathlib import Path
from statistics import median

from electrolog.answers import fits
from electrolog.answers.asked import Run
from electrolog.answers.fitting import whole_cohort
from electrolog.lab import Lab, open_lab
from electrolog.record import queries
from tests.answers.fleet_folder import WAVEFORM
from tests.bench.one_fit import peak_gb
from tests.bench.timing import by_turns, typed
from tests.scale import consortium, one_lab

LOOKED_AT, ROUNDS = 60, 15
SETTING, RUN_MIN = "in-vivo", 120.0


def ask(where: str, small: str) -> None:
    places = {"many": where, "few": small}
    labs = {name: open_lab(place) for name, place in places.items()}
    probes = dict(zip(labs, alike(*labs.values()), strict=True))
    for name, (label, beside) in probes.items():
        print(f"{name}: {label}, {beside} calibrations of the same days' probes")
    questions: dict[str, Callable[[Lab, str], object]] = {
        "check": lambda lab, label: lab.check([label], run_of(lab)),
        "history": lambda lab, label: lab.readings([label]),
    }
    for question, put in questions.items():
        say(f"{question}, in one process", {name: partial(put, lab, probes[name][0]) for name, lab in labs.items()})
        own_s = {name: partial(processor_s, partial(put, lab, probes[name][0])) for name, lab in labs.items()}
        say(f"{question}, our processor's time", own_s)
        whole = {name: typed("--db", places[name], *words(question, labs[name], probes[name][0])) for name in labs}
        say(f"{question}, whole command", whole)


def say(what: str, works: Mapping[str, Callable[[], object]]) -> None:
    taken = by_turns(works, ROUNDS)
    pairs = zip(taken["many"].seconds, taken["few"].seconds, strict=True)
    ratio = median(many / few for many, few in pairs)
    least = {name: min(one.seconds) * 1000 for name, one in taken.items()}
    said = ", ".join(f"{name} {one.median_s * 1000:.0f} ms (least {least[name]:.0f})" for name, one in taken.items())
    print(f"{what}: {said}; median ratio {ratio:.2f}, of the least {least['many'] / least['few']:.2f}", flush=True)


def processor_s(work: Callable[[], object]) -> float:
    begun = time.process_time()
    work()
    return time.process_time() - begun


def words(question: str, lab: Lab, label: str) -> Sequence[str]:
    if question == "history":
        return ("history", label)
    return ("check", label, "--analyte", assay_of(lab), "--waveform", WAVEFORM, "--setting", SETTING, "--run", "2h")


def alike(many: Lab, few: Lab) -> tuple[tuple[str, int], tuple[str, int]]:
    """A probe of each, with the median of the small record's calibrations at hand, and as near to it as can be."""
    of_few = sorted(beside(few), key=lambda pair: pair[1])
    chosen = of_few[len(of_few) // 2]
    return min(beside(many), key=lambda pair: abs(pair[1] - chosen[1])), chosen


def beside(lab: Lab) -> list[tuple[str, int]]:
    """Probes of the last lab, and how many calibrations those have that were measured on the same days."""
    found = []
    with lab.record.reading() as connection:
        asked = whole_cohort(connection, assay_of(lab))
        members = queries.calibrated_with(connection, asked.analyte_id)[:LOOKED_AT]
        for probe in queries.probes_by_id(connection, members):
            own = queries.calibrations(connection, [probe["id"]], asked.analyte_id, points=False)
            fellows = queries.calibrated_on(connection, {one.at.date() for one in own}, asked.analyte_id)
            at_hand = queries.calibrations(connection, fellows, asked.analyte_id, points=False)
            found.append((probe["electrode"], len(at_hand)))
    return found


@cache
def assay_of(lab: Lab) -> str:
    return str(max(row["analyte"] for row in lab.rows("analytes") if row["analyte"].startswith(one_lab.ASSAY[:-3])))


def run_of(lab: Lab) -> Run:
    return Run(assay_of(lab), WAVEFORM, SETTING, RUN_MIN)


def gather(where: str, analyte: str) -> None:
    lab = open_lab(where)
    with lab.record.reading() as connection:
        asked = whole_cohort(connection, analyte)
    before_gb, begun = peak_gb(), time.process_time()
    cohort, seen = fits.gathered(lab.record, asked)
    taken_s = time.process_time() - begun
    read = f"{len(cohort.units)} units, {seen.readings} calibrations"
    print(f"{read}: {taken_s:.1f} s; peak {before_gb} GB, then {peak_gb()} GB")


def main(arguments: Sequence[str]) -> int:
    match arguments:
        case ["lab", file, probes]:
            one_lab.make(Path(file), int(probes))
        case ["fill", where, file, labs]:
            consortium.fill(where, Path(file), int(labs))
        case ["ask", where, small]:
            ask(where, small)
        case ["gather", where, analyte]:
            gather(where, analyte)
        case _:
            print(__doc__)
            return 2
    return 0


if __name__ == "__main__":
    sys.exit(main(sys.argv[1:]))
