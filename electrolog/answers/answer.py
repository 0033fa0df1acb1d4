"""How an answer prints itself: a line for each thing that it says, in a notebook a table; units stand in the names."""

from __future__ import annotations

from collections.abc import Iterable, Mapping, Sequence
from dataclasses import fields, is_dataclass
from datetime import datetime
from html import escape
from typing import Any

from electrolog.clock import shown_moment
from electrolog.units import shown_number

MOST_ITEMS = 6


class Answer:
    """What the door's questions give. repr() stays that of a dataclass, whole and for a debugger."""

    def __str__(self) -> str:
        rows = [(name, said(value)) for name, value in spread(self)]
        wide = max((len(name) for name, _ in rows), default=0)
        return "\n".join([type(self).__name__, *(f"  {name:{wide}}  {text}" for name, text in rows)])

    def _repr_html_(self) -> str:
        rows = [f"<tr><th>{escape(name)}</th><td>{escape(said(value))}</td></tr>" for name, value in spread(self)]
        return f"<table style='text-align:left'><caption>{type(self).__name__}</caption>{''.join(rows)}</table>"

    def _repr_pretty_(self, printer: Any, cycle: bool) -> None:
        """For answers in a list, which a notebook prints one by one."""
        printer.text(str(self))


def spread(answer: Any, prefix: str = "") -> Iterable[tuple[str, Any]]:
    """What an answer holds, parts of its parts joined by a point: `figures.lod_um`."""
    for name, value in parts(answer):
        key = f"{prefix}{name}"
        if has_parts(value):
            yield from spread(value, f"{key}.")
        else:
            yield key, value


def has_parts(value: Any) -> bool:
    return isinstance(value, Mapping) or (is_dataclass(value) and not isinstance(value, type))


def parts(answer: Any) -> Iterable[tuple[str, Any]]:
    if isinstance(answer, Mapping):
        return ((str(name), value) for name, value in answer.items())
    return ((field.name, getattr(answer, field.name)) for field in fields(answer))


def said(value: Any) -> str:
    """A value as one reads it: four digits of a number, a moment with its zone's time, a long list by its length."""
    if value is None:
        return "unknown"
    if isinstance(value, bool | str):
        return str(value)
    if isinstance(value, int | float):
        return shown_number(float(value), 4)
    if isinstance(value, datetime):
        return shown_moment(value)
    if isinstance(value, Sequence):
        return _items(value)
    shape = getattr(value, "shape", None)
    return str(value) if shape is None else f"array of {' × '.join(map(str, shape))} numbers"


def _items(values: Sequence[Any]) -> str:
    if any(map(has_parts, values)) or len(values) > MOST_ITEMS:
        return f"{len(values)} of {type(values[0]).__name__}" if values else "none"
    return "; ".join(map(said, values)) or "none"
