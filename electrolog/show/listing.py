"""A plain list of rows."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from datetime import datetime
from typing import Any

from electrolog.clock import shown_moment
from electrolog.show.entries import plain_name
from electrolog.show.machine import print_csv, print_json
from electrolog.show.tables import print_table
from electrolog.units import shown_number


def answer(rows: Sequence[Mapping[str, Any]], columns: Sequence[str], json: bool, csv: bool) -> None:
    if json:
        print_json(rows)
    elif csv:
        print_csv(rows, columns)
    else:
        used = [name for name in columns if any(row[name] is not None for row in rows)] or list(columns)
        print_table([_heading(name) for name in used], [[_shown(row[name]) for name in used] for row in rows])


def _heading(column: str) -> str:
    unit = column.removeprefix(plain_name(column).replace(" ", "_")).strip("_")
    return plain_name(column) + (f" ({_UNITS.get(unit, unit)})" if unit else "")


_UNITS = {"um": "µM or µm", "v": "V", "v_s": "V/s", "hz": "Hz", "g_mol": "g/mol"}


def _shown(value: Any) -> object:
    if isinstance(value, float):
        return shown_number(value, 6)
    return shown_moment(value) if isinstance(value, datetime) else value
