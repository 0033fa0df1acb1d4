"""What was understood of an entry, said back at once."""

from __future__ import annotations

from collections.abc import Sequence
from datetime import datetime
from typing import Any

from electrolog import units
from electrolog.answers.entering import Entered
from electrolog.answers.handling import split
from electrolog.clock import shown_moment
from electrolog.record.columns import Number, Value
from electrolog.record.sheets import BY_NAME
from electrolog.show.text import one_line

_LEFT_OUT = ("electrode", "at", "start")


def as_dict(entered: Entered) -> dict[str, Any]:
    known = {name: value for name, value in entered.values.items() if value is not None}
    return {"kind": BY_NAME[entered.sheet].one, "number": entered.row_id, **known, "doubts": list(entered.doubts)}


def sentences(entered: Sequence[Entered]) -> list[str]:
    """`coating 17  B9-01  2026-12-01 14:30  material PFSA, method dip`"""
    return [sentence(one) for one in entered]


def sentence(one: Entered) -> str:
    sheet = BY_NAME[one.sheet]
    moment = one.values.get(sheet.time_column or "")
    parts = [
        f"{sheet.one} {one.row_id}",
        one_line(one.values.get("electrode") or ""),
        shown_moment(moment) if isinstance(moment, datetime) else "",
        ", ".join(f"{plain_name(name)} {shown(one.sheet, name, value)}" for name, value in said(one).items()),
    ]
    return "  ".join(part for part in parts if part)


def said(one: Entered) -> dict[str, Value]:
    return {
        name: value
        for name, value in one.values.items()
        if value is not None and name not in _LEFT_OUT and not (name == "note" and split(str(value))[0] is None)
    }


def plain_name(column: str) -> str:
    """`exposed_length_um` -> 'exposed length': the unit stands beside the number."""
    stem = column
    for ending in ("_na_um", "_v_s", "_g_mol", "_wt_pct", "_um", "_na", "_min", "_s", "_v", "_c", "_hz"):
        if column.endswith(ending):
            stem = column.removesuffix(ending)
            break
    return stem.replace("_", " ")


def shown(sheet: str, name: str, value: object) -> str:
    """A value of a column, with its unit."""
    column = BY_NAME[sheet].by_name.get(name)
    if name == "note" and isinstance(value, str):
        value, _ = split(value)
    if value is None:
        return "unknown"
    if isinstance(value, datetime):
        return shown_moment(value)
    if isinstance(column, Number) and isinstance(value, int | float):
        if column.unit is units.MINUTES:
            return units.shown_duration(float(value))
        if column.unit is units.CONCENTRATION_UM:
            return units.shown_concentration(float(value))
        return f"{units.shown_number(float(value), 6)} {column.unit.sign}".rstrip()
    return one_line(value)
