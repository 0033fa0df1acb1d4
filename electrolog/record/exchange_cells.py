"""The cells of one column of a file, read many at once."""

from __future__ import annotations

import math
from collections.abc import Callable, Iterator, Sequence
from dataclasses import dataclass
from datetime import tzinfo
from typing import Any

from electrolog.clock import plain_moments
from electrolog.errors import InputError, shortened
from electrolog.record import columns as kinds
from electrolog.record.columns import Column, Value


class Refusal(str):
    """Stands in the place of a value that couldn't be read, and says why."""

    __slots__ = ()


class Memo(dict[str, object]):
    """Texts repeat down a column: each is read once."""

    def __init__(self, read: Callable[[str], object]) -> None:
        super().__init__()
        self._read = read

    def __missing__(self, text: str) -> object:
        value = self[text] = self._read(text)
        return value


@dataclass
class CellReader:
    column: Column
    zone: tzinfo | None

    def __post_init__(self) -> None:
        self._memo = Memo(self._one)

    def read(self, texts: Sequence[str]) -> list[Any]:
        """The values of the cells, a Refusal for each that can't be taken, None for each unknown."""
        if isinstance(self.column, kinds.Number):
            numbers = _plain_numbers(self.column, texts)
            return [self._one(text) for text in texts] if numbers is None else numbers
        new = list({text: None for text in texts if text not in self._memo})
        self._memo.update(zip(new, self._plain(new) or (), strict=False))
        return list(map(self._memo.__getitem__, texts))

    def _plain(self, texts: Sequence[str]) -> Sequence[Any] | None:
        if isinstance(self.column, kinds.Moment):
            return plain_moments(texts)
        return _plain_labels(texts) if isinstance(self.column, kinds.Label) else None

    def _one(self, text: str) -> Value | Refusal:
        blank = text == "" if isinstance(self.column, kinds.Text) else not text.strip()
        if blank:
            return None
        try:
            return self.column.read(text, self.zone)
        except InputError as why:
            if isinstance(self.column, kinds.Choice):
                accepted = ", ".join(self.column.choices)
                return Refusal(f"{self.column.name}: found '{shortened(text)}'; accepted: {accepted}")
            return Refusal(why.message)


# The quick ways, for a column in which nothing is wrong; None where each cell has to be looked at.


def _plain_numbers(column: kinds.Number, texts: Sequence[str]) -> list[Any] | None:
    if column.whole or "_" in "".join(texts):
        return None
    try:
        known = list(map(float, filter(None, texts) if "" in texts else texts))
        if not math.isfinite(sum(known)):
            return None
        for extreme in (min(known), max(known)) if known else ():
            column.checked(extreme, "")
    except (ValueError, InputError):
        return None
    if 0.0 in known:
        known = [value + 0.0 for value in known]  # -0.0 becomes 0.0, which is written the same way again
    if len(known) == len(texts):
        return known
    found = iter(known)
    return [next(found) if text else None for text in texts]


def _plain_labels(texts: Sequence[str]) -> list[Any] | None:
    """Of printable ASCII without a space, so that nothing is invisible or stray."""
    together = "".join(texts)
    if not (together.isascii() and together.isprintable()) or " " in together:
        return None
    return None if max(map(len, texts), default=0) > kinds.LABEL_LIMIT else [text or None for text in texts]


def refusals(values: Sequence[object]) -> Iterator[tuple[int, Refusal]]:
    if Refusal not in set(map(type, values)):
        return iter(())
    return ((index, value) for index, value in enumerate(values) if type(value) is Refusal)
