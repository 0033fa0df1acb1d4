"""The newest event that somebody logged and that still stands."""

from __future__ import annotations

from sqlalchemy import select

from electrolog.record import schema
from electrolog.record.readable import Row, row_by_id
from electrolog.record.sheets import BY_NAME, EVENTS, Sheet
from electrolog.record.store import Connection


def last_entry(connection: Connection, who: str) -> tuple[Sheet, Row] | None:
    """Its sheet and its row, links by name; None where there is none."""
    journal = schema.journal
    query = (
        select(journal.c.sheet, journal.c.row_id)
        .where(journal.c.who == who, journal.c.action == "add", journal.c.sheet.in_([sheet.name for sheet in EVENTS]))
        .order_by(journal.c.seq.desc())
    )
    for sheet, row_id in connection.execute(query.execution_options(yield_per=20)):
        table = schema.tables[sheet]
        struck = connection.execute(select(table.c.struck).where(table.c.id == row_id)).scalar_one()
        if struck is None:
            return BY_NAME[sheet], row_by_id(connection, BY_NAME[sheet], row_id)
    return None
