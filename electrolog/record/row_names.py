"""What a person calls a row: its label, or for an event its number and its probe."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Iterable

from sqlalchemy import Connection, select

from electrolog.record import schema, sheets
from electrolog.record.journal import Entry
from electrolog.record.sheets import BY_NAME, Sheet

Place = tuple[str, int]  # sheet, row number
_MANY = 500  # an engine limits the length of one statement


def named(connection: Connection, entries: Iterable[Entry]) -> list[str]:
    """`add calibration C0042`, `amend point C0042/3`, `strike exposure 12 of B9-01`: what each entry did to what."""
    told = list(entries)
    names = _names(connection, {(one.sheet, one.row_id) for one in told})
    return [f"{one.action} {BY_NAME[one.sheet].one} {_named(one, names)}" for one in told]


def _named(entry: Entry, names: dict[Place, str]) -> str:
    name = names.get((entry.sheet, entry.row_id), str(entry.row_id))
    return f"{name}/{entry.change['ordinal']}" if "ordinal" in entry.change else name


def _names(connection: Connection, places: set[Place]) -> dict[Place, str]:
    by_sheet: dict[str, list[int]] = defaultdict(list)
    for name, row_id in places:
        by_sheet[name].append(row_id)
    found: dict[Place, str] = {}
    for name, ids in by_sheet.items():
        for start in range(0, len(ids), _MANY):
            found |= _of_sheet(connection, BY_NAME[name], ids[start : start + _MANY])
    return found


def _of_sheet(connection: Connection, sheet: Sheet, ids: list[int]) -> dict[Place, str]:
    asked = sheets.CALIBRATIONS if sheet is sheets.POINTS else sheet  # the journal names points by their calibration
    table = schema.tables[asked.name]
    if asked.labelled:
        query = select(table.c.id, table.c[asked.key[0]]).where(table.c.id.in_(ids))
        return {(sheet.name, row_id): name for row_id, name in connection.execute(query)}
    if "electrode_id" not in table.c:
        return {}
    probes = schema.tables["electrodes"]
    query = select(table.c.id, probes.c.electrode).join(probes, probes.c.id == table.c.electrode_id)
    rows = connection.execute(query.where(table.c.id.in_(ids)))
    return {(sheet.name, row_id): f"{row_id} of {probe}" for row_id, probe in rows}
