"""Answers as data frames: one row each, the unit in the column's name as everywhere."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from typing import TYPE_CHECKING, Any

from electrolog.answers.answer import has_parts, spread

if TYPE_CHECKING:
    import pandas as pd

INTERNAL = ("id", "ordinal")


def frame(answers: Iterable[Any]) -> pd.DataFrame:
    """A DataFrame of any list of answers: readings, forecasts, checks, rows of a sheet.

    One row for each answer. What an answer holds in parts is spread over columns joined by a point
    (`figures.lod_um`, `sensitivity_na_um.end.0.5`); lists stay in their cell. Unknown is NaN, NaT or None.
    Moments are in UTC. Raises TypeError for what is neither a dataclass nor a mapping.
    """
    import pandas as pd

    found = pd.DataFrame([dict(_row(answer)) for answer in answers])
    return found.drop(columns=[name for name in INTERNAL if name in found.columns])


def _row(answer: Any) -> Iterable[tuple[str, Any]]:
    if not has_parts(answer):
        raise TypeError(f"{type(answer).__name__} is no answer; accepted: a dataclass or a mapping")
    for name, value in spread(answer):
        yield name, list(value) if isinstance(value, Sequence) and not isinstance(value, str) else value
