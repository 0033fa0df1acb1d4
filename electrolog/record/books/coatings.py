"""The coating that an entry names: a row of its own where its day is told, or where a person says how to take it."""

from __future__ import annotations

from collections.abc import Callable, Iterator
from datetime import datetime, timedelta

from electrolog.errors import InputError, shortened
from electrolog.record.books.drafts import Draft, Extract
from electrolog.record.books.grid import shown
from electrolog.record.books.mapping import BookMapping
from electrolog.record.books.numbers import UNKNOWN
from electrolog.record.books.views import Found, View
from electrolog.record.books.vocabulary import Vocabulary
from electrolog.record.columns import Value

BARE = {*UNKNOWN, "no", "bare", "uncoated", "none (bare)", "0"}
BEFORE = timedelta(hours=1)  # the entry that first names a coating whose day nobody wrote down

Moment = Callable[[Found], datetime]  # reads a cell with a day


class Coatings:
    def __init__(self, mapping: BookMapping, vocabulary: Vocabulary, out: Extract) -> None:
        self.mapping, self.vocabulary, self.out = mapping, vocabulary, out
        self.found: dict[tuple[str, str, datetime | None], Draft] = {}

    def see(self, view: View, electrode: str, entries: list[datetime], note: str, moment: Moment) -> str:
        """Takes the coating of an entry at `entries` up; returns what of it belongs into the entry's own note."""
        cell = view.first("coating")
        if cell is None or shown(cell.value).casefold() in BARE:
            return ""
        said = shown(cell.value)
        word = self.vocabulary.coatings.get(self.mapping.words.get(said, said).casefold())
        kept = f"{cell.heading}: {said}"
        if word is None:
            why = f"'{shortened(said, 60)}' is no word of the list 'coating material': kept in the note"
            self.out.say("doubtful", view.place(cell), f"{why}; under [words] it can be made one")
            return kept
        at = self._day(view, moment)
        if at is None and not self._may_be_assumed(view, cell):
            return kept
        self._add(view, electrode, word, at, entries, note)
        return ""

    def drafts(self) -> Iterator[Draft]:
        """One for each probe, material and day."""
        yield from self.found.values()

    def _day(self, view: View, moment: Moment) -> datetime | None:
        cell = view.first("coated")
        if cell is None:
            return None
        try:
            return moment(cell)
        except InputError as why:
            self.out.say("doubtful", view.place(cell), f"{why.message}; the day of coating is left unknown")
            return None

    def _may_be_assumed(self, view: View, cell: Found) -> bool:
        answer = self.mapping.answered("coated")
        if not answer:
            why = f"{view.place(cell)} names a coating and no day; before: an hour before the first entry that names it"
            self.out.ask("coated", "When was it put on?", why, ("before", "note"))
        return answer != "note"

    def _add(
        self, view: View, electrode: str, word: str, at: datetime | None, entries: list[datetime], note: str
    ) -> None:
        known = self.vocabulary.coated.get((electrode, word))
        when = at or known or min(entries) - BEFORE
        assumed = "" if at else "day of coating assumed; "
        key = electrode, word, at
        first = self.found.get(key)
        if first is None or (known is None and when < first.values["at"]):  # type: ignore[operator]
            values: dict[str, Value] = {"electrode": electrode, "at": when, "material": word}
            self.found[key] = Draft("coatings", values | {"note": f"{assumed}{note}"}, view.range)
