"""Which probe recorded a file: by its own word, else by its name or its folder's; never by a likeness."""

from __future__ import annotations

import difflib
import re
from collections.abc import Iterable, Sequence
from dataclasses import dataclass

from electrolog.errors import InputError, UnknownName, shortened
from electrolog.record.books.vocabulary import alike

MOST_NEAR = 3


@dataclass(frozen=True)
class Named:
    """A label as the record spells it, and where it was found."""

    label: str
    where: str


class Labels:
    """The record's labels, to be found in what people write."""

    def __init__(self, known: Iterable[str]) -> None:
        self._folded = {label.casefold(): label for label in known}
        # A label of digits alone would be found in every date.
        self._telling = sorted((key for key in self._folded if not key.isdigit()), key=len, reverse=True)

    def spelled(self, text: str) -> str | None:
        return self._folded.get(text.strip().casefold())

    def required(self, text: str) -> str:
        """Raises UnknownName with the nearest labels."""
        found = self.spelled(text)
        if found is None:
            raise UnknownName(f"no probe is called '{shortened(text)}'; {self._near(text)}")
        return found

    def inside(self, name: str) -> list[str]:
        """Labels that stand in a file's name as words of their own; a longer one hides those within it."""
        rest, found = name.casefold(), []
        for key in self._telling:
            pattern = rf"(?<![^\W_]){re.escape(key)}(?![^\W_])"
            if re.search(pattern, rest):
                found.append(self._folded[key])
                rest = re.sub(pattern, "\0", rest)
        return found

    def _near(self, *words: str) -> str:
        """The labels that look most like any of the words."""
        by_likeness = {alike(key): label for key, label in self._folded.items()}
        likely: dict[str, float] = {}
        for word in map(alike, words):
            for key in difflib.get_close_matches(word, list(by_likeness), n=MOST_NEAR, cutoff=0.5):
                ratio = difflib.SequenceMatcher(a=key, b=word).ratio()
                likely[by_likeness[key]] = max(ratio, likely.get(by_likeness[key], 0.0))
        near = sorted(likely, key=lambda label: -likely[label])[:MOST_NEAR]
        if near:
            return f"the nearest labels are {', '.join(near)}"
        return f"known: {', '.join(list(self._folded.values())[:12])}" if self._folded else "none is known yet"

    def by_name(self, parts: Sequence[str]) -> Named:
        """`parts`: the file's name, then its folders', from the inside out. Raises InputError unless one is told."""
        found = [(part, self.inside(part)) for part in parts]
        told = list(dict.fromkeys(label for _, labels in found for label in labels))
        if len(told) > 1:
            raise InputError(f"its name and folders name {len(told)} probes: {', '.join(told)}; accepted: one")
        if not told:
            raise InputError(f"names no probe, nor does its file or folder; {self._near(*_words(parts[0]))}")
        (part,) = [part for part, labels in found if labels][:1]
        return Named(told[0], "the file's name" if part == parts[0] else f"the folder '{shortened(part, 40)}'")


def _words(name: str) -> list[str]:
    """The parts of a file's name that may be a label: none is without a letter, or every date would be like one."""
    return [word for word in re.split(r"[\s_]+", name) if re.search(r"[^\W\d_]", word)] or [name]
