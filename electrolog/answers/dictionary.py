"""The data dictionary: every column of every sheet, from the declarations that the record itself is made of."""

from __future__ import annotations

from electrolog.record import columns as kinds
from electrolog.record.sheets import SHEETS


def entries() -> list[dict[str, str]]:
    return [
        {
            "sheet": sheet.name,
            "column": column.name,
            "unit": column.unit.sign if isinstance(column, kinds.Number) else "",
            "needed": "yes" if column.required else "no",
            "meaning": column.about,
            "accepts": _accepts(column),
        }
        for sheet in SHEETS
        for column in sheet.columns
    ]


def _accepts(column: kinds.Column) -> str:
    if isinstance(column, kinds.Number):
        return column.accepted.removeprefix("accepted: ").split(", .")[0]
    if isinstance(column, kinds.Choice):
        return ", ".join(column.choices)
    if isinstance(column, kinds.Link):
        return f"a {column.to} label"
    if isinstance(column, kinds.Word):
        return f"a word of the list {column.kind}"
    kind = {"Moment": "ISO 8601 with an offset", "Day": "ISO 8601 date", "Vertices": "potentials in V, space-separated"}
    return kind.get(type(column).__name__, "text")
