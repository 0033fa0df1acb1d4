"""What is started before a coffee: the backtest and the lab's report."""

from __future__ import annotations

from collections.abc import Iterator

from tests.bench import labs
from tests.bench.line import Aim, Family, Line
from tests.bench.timing import by_turns, typed

REPORTED, TESTED = 2000, 1000


def reporting() -> Iterator[Line]:
    """The lab on one page: every probe on its shelf."""
    file, page = labs.lab_file(REPORTED), labs.scratch() / "report.html"
    taken = by_turns({"report": typed("--db", file, "report", "--lab", "--out", page)})["report"]
    work = f"report of a lab of {REPORTED:,} probes"
    yield Line(work, "", taken, None, taken.median_s, Aim(5, "s"))
    yield Line(f"{work}: its size", "", None, None, page.stat().st_size / 1e6, Aim(5, "MB"))


def backtesting() -> Iterator[Line]:
    file = labs.lab_file(TESTED)
    work = {"backtest": typed("--db", file, "backtest", "--analyte", labs.ANALYTE)}
    taken = by_turns(work, rounds=1, warm=0)["backtest"]
    yield Line(f"backtest of {TESTED:,} probes", "", taken, None, taken.median_s, Aim(60, "s"), "once")


FAMILIES = (Family("report", reporting), Family("backtest", backtesting, heavy=True))
