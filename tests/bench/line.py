"""One line of the table: what was done, what it took, what it is held against, and whether the aim is met."""

from __future__ import annotations

from collections.abc import Callable, Iterator
from dataclasses import dataclass

from tests.bench.timing import Taken

AT_MOST, AT_LEAST = "at most", "at least"


@dataclass(frozen=True)
class Aim:
    """`unit`: × is a ratio of medians, otherwise what `Line.value` is in."""

    limit: float
    unit: str = "×"
    sense: str = AT_MOST

    def met(self, value: float) -> bool:
        return value <= self.limit if self.sense == AT_MOST else value >= self.limit

    def __str__(self) -> str:
        sign = "≤" if self.sense == AT_MOST else "≥"
        return f"{sign} {self.limit:g}{self.unit if self.unit == '×' else ' ' + self.unit}".rstrip()


@dataclass(frozen=True)
class Line:
    """`value` is what the aim speaks of; `ours` and `peer` are seconds, `peer` None where there is none."""

    work: str
    against: str
    ours: Taken | None
    peer: Taken | None
    value: float | None
    aim: Aim
    note: str = ""

    @property
    def by_processor_time(self) -> float | None:
        """The same ratio, which a busy machine disturbs less; None for a line that is no ratio."""
        ours, peer = (taken and taken.median_processor_s for taken in (self.ours, self.peer))
        if not ours or not peer or self.aim.unit != "×":
            return None
        return ours / peer if self.aim.sense == AT_MOST else peer / ours

    @property
    def verdict(self) -> str:
        if self.value is None:
            return "left out"
        return "met" if self.aim.met(self.value) else "not met"


@dataclass(frozen=True)
class Family:
    """Lines that are measured together; `heavy` ones take minutes."""

    name: str
    measure: Callable[[], Iterator[Line]]
    heavy: bool = False


def ratio(work: str, against: str, ours: Taken, peer: Taken, limit: float, sense: str = AT_MOST) -> Line:
    """At most so many times the peer; `AT_LEAST`: so many times faster."""
    times = ours.median_s / peer.median_s
    value = times if sense == AT_MOST else 1 / times
    return Line(work, against, ours, peer, value, Aim(limit, "×", sense))


def left_out(work: str, against: str, aim: Aim, why: str) -> Line:
    return Line(work, against, None, None, None, aim, why)
