"""How a calibration's points were had and weighted, where a person or a recording decided it.

It is kept on the last line of the calibration's note, as JSON after a mark: so it goes into every export and into
the journal, is amended like any note, and figures made anew follow it.
"""

from __future__ import annotations

import json
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import Any

from electrolog.errors import ElectrologError
from electrolog.measure import weights

MARK = "handling: "


@dataclass(frozen=True)
class Handling:
    """`signal`: the recording the points came from, with every setting and what was found in it."""

    weights: str = weights.EQUAL
    through_zero: bool = False
    signal: Mapping[str, Any] | None = None
    unreadable: str | None = None

    def to_dict(self) -> dict[str, Any]:
        """Only what isn't the usual way."""
        said = {
            "weights": None if self.weights == weights.EQUAL else self.weights,
            "through_zero": self.through_zero or None,
            "signal": self.signal,
        }
        return {name: value for name, value in said.items() if value is not None}

    def weights_of(self, points: Sequence[tuple[float, float]]) -> Any:
        """(n,) or None for equal ones. Raises DataError where the points can't give them."""
        return weights.by_scheme(self.weights, *zip(*points, strict=True)) if points else None


def with_handling(note: str | None, handling: Handling) -> str | None:
    """The note as it is kept."""
    said = handling.to_dict()
    line = MARK + json.dumps(said, ensure_ascii=False, allow_nan=False) if said else None
    return "\n".join(text for text in (note, line) if text) or None


def split(note: str | None) -> tuple[str | None, Handling]:
    """A kept note as what a person wrote, and the handling; a line that can't be read stays with the person's."""
    text, _, last = (note or "").rpartition("\n")
    if not last.startswith(MARK):
        return note, Handling()
    try:
        return text or None, _read(json.loads(last.removeprefix(MARK)))
    except (ValueError, TypeError, AttributeError, ElectrologError):
        said = "the note's line on its handling can't be read: the points were taken as they stand, with equal weights"
        return note, Handling(unreadable=said)


def _read(said: Mapping[str, Any]) -> Handling:
    return Handling(
        weights=weights.scheme(said.get("weights", weights.EQUAL)),
        through_zero=bool(said.get("through_zero", False)),
        signal=said.get("signal"),
    )
