"""What reading a book gives: rows about to be taken in, each with its origin, and what there is to say about cells."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass, field

from electrolog.record.columns import Value

Point = tuple[float, float]  # µM, nA
TIME_ASSUMED = "time of day assumed"  # stands in the note of a row whose cell had only a day


@dataclass(frozen=True)
class Remark:
    """`kind`: doubtful (taken, have a look), refused (not taken) or left out (nothing to take)."""

    kind: str
    place: str
    said: str


@dataclass(frozen=True)
class Question:
    """What the book can't tell. `accepted` empty: any text. Without an answer nothing is written."""

    key: str
    text: str
    why: str
    accepted: tuple[str, ...] = ()


@dataclass
class Draft:
    """One row of the record, as the sheet's columns hold it; `place` is its cell range in the book."""

    sheet: str
    values: dict[str, Value]
    place: str
    points: tuple[Point, ...] = ()
    doubtful: bool = False

    def same_as(self, other: Draft) -> bool:
        ours, theirs = ({k: v for k, v in one.values.items() if k != "note"} for one in (self, other))
        return ours == theirs and sorted(self.points) == sorted(other.points)


@dataclass
class Extract:
    drafts: list[Draft] = field(default_factory=list)
    remarks: list[Remark] = field(default_factory=list)
    questions: dict[str, Question] = field(default_factory=dict)
    headings: dict[str, str] = field(default_factory=dict)  # heading -> where it stands first

    def say(self, kind: str, place: str, said: str) -> None:
        remark = Remark(kind, place, said)
        if remark not in self.remarks[-50:]:
            self.remarks.append(remark)

    def ask(self, key: str, text: str, why: str, accepted: Iterable[str] = ()) -> None:
        self.questions.setdefault(key, Question(key, text, why, tuple(accepted)))

    def of(self, sheet: str) -> list[Draft]:
        return [draft for draft in self.drafts if draft.sheet == sheet]
