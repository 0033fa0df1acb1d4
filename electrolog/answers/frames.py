"""Answers as data frames: one row each, the unit in the column's name as everywhere."""

from __future__ import annotations

from collections.abc import Iterable, Mapping, Sequence
from dataclasses import fields, is_dataclass
from typing import TYPE_CHECKING, Any

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

    found = pd.DataFrame([dict(_spread(answer)) for answer in answers])
    return found.drop(columns=[name for name in INTERNAL if name in found.columns])


def _spread(answer: Any, prefix: str = "") -> Iterable[tuple[str, Any]]:
    if not prefix and not _has_parts(answer):
        raise TypeError(f"{type(answer).__name__} is no answer; accepted: a dataclass or a mapping")
    for name, value in _parts(answer):
        key = f"{prefix}{name}"
        if _has_parts(value):
            yield from _spread(value, f"{key}.")
        elif isinstance(value, Sequence) and not isinstance(value, str):
            yield key, list(value)
        else:
            yield key, value


def _has_parts(value: Any) -> bool:
    return isinstance(value, Mapping) or (is_dataclass(value) and not isinstance(value, type))


def _parts(answer: Any) -> Iterable[tuple[str, Any]]:
    if isinstance(answer, Mapping):
        return ((str(name), value) for name, value in answer.items())
    return ((field.name, getattr(answer, field.name)) for field in fields(answer))
