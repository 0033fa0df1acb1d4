"""How a calibration's points were had and weighted, where a person or a recording decided it.

It is kept on the last line of the calibration's note, as JSON after a mark: so it goes into every export and into
the journal, is amended like any note, and figures made anew follow it.
"""

from __future__ import annotations

import json
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace
from typing import Any

from electrolog.errors import ElectrologError, InputError, shortened
from electrolog.measure.schemes import EQUAL, scheme

MARK = "handling: "


@dataclass(frozen=True)
class Handling:
    """`signal`: the recording the points came from, with every setting and what was found in it."""

    weights: str = EQUAL
    through_zero: bool = False
    signal: Mapping[str, Any] | None = None
    unreadable: str | None = None

    def to_dict(self) -> dict[str, Any]:
        """Only what isn't the usual way."""
        said = {
            "weights": None if self.weights == EQUAL else self.weights,
            "through_zero": self.through_zero or None,
            "signal": self.signal,
        }
        return {name: value for name, value in said.items() if value is not None}

    def weights_of(self, points: Sequence[tuple[float, float]]) -> Any:
        """(n,) or None for equal ones. Raises DataError where the points can't give them."""
        from electrolog.measure.weights import by_scheme

        return by_scheme(self.weights, *zip(*points, strict=True)) if points else None


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
    except (ValueError, TypeError, AttributeError, RecursionError, ElectrologError):
        said = "the note's line on its handling can't be read: the points were taken as they stand, with equal weights"
        return note, Handling(unreadable=said)


def amended(note: str | None, typed: Mapping[str, str]) -> dict[str, str]:
    """Corrections as typed, with the note as it is to be kept: a new text leaves the handling as it is.

    `weights` and `through_zero` are corrected under their own names, though they stand in the note.
    """
    rest = {name: value for name, value in typed.items() if name not in ("note", "weights", "through_zero")}
    if len(rest) == len(typed):
        return rest
    text, known = split(note)
    new_text, given = split(typed.get("note", text or ""))
    known = given if given.to_dict() else known
    known = replace(
        known,
        weights=scheme(typed["weights"] or EQUAL) if "weights" in typed else known.weights,
        through_zero=_yes(typed["through_zero"]) if "through_zero" in typed else known.through_zero,
    )
    return rest | {"note": with_handling(new_text, known) or ""}


def changes(before: str | None, after: str | None) -> dict[str, tuple[Any, Any]]:
    """What two kept notes differ in, under the names a person uses."""
    (old_text, old), (new_text, new) = split(before), split(after)
    pairs = {
        "note": (old_text, new_text),
        "weights": (old.weights, new.weights),
        "through_zero": (_yes_or_no(old.through_zero), _yes_or_no(new.through_zero)),
    }
    return {name: pair for name, pair in pairs.items() if pair[0] != pair[1]}


def _yes_or_no(value: bool) -> str:
    return "yes" if value else "no"


def _yes(text: str) -> bool:
    if text.strip().casefold() not in ("yes", "no", ""):
        raise InputError(f"through_zero: '{shortened(text)}' is neither; accepted: yes, no")
    return text.strip().casefold() == "yes"


def _read(said: Mapping[str, Any]) -> Handling:
    signal = said.get("signal")
    if not isinstance(signal, dict | None):
        raise ValueError("a signal is told as an object")
    return Handling(
        weights=scheme(said.get("weights", EQUAL)),
        through_zero=bool(said.get("through_zero", False)),
        signal=signal,
    )
