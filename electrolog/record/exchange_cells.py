"""The cells of one column of a file, read many at once."""

from __future__ import annotations

import math
from collections.abc import Callable, Iterator, Sequence
from dataclasses import dataclass
from datetime import tzinfo
from typing import Any

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
        return list(map(self._memo.__getitem__, texts))

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


def _plain_numbers(column: kinds.Number, texts: Sequence[str]) -> list[Any] | None:
    """The quick way for a column in which nothing is wrong; None where each cell has to be looked at."""
    try:
        values = [float(text) + 0.0 if text else None for text in texts]
        known = [value for value in values if value is not None]
        if column.whole or not all(map(math.isfinite, known)) or "_" in "".join(texts):
            return None
        for extreme in (min(known), max(known)) if known else ():
            column.checked(extreme, "")
    except (ValueError, InputError):
        return None
    return values


def refusals(values: Sequence[object]) -> Iterator[tuple[int, Refusal]]:
    return ((index, value) for index, value in enumerate(values) if type(value) is Refusal)
