"""What was corrected of one probe: every amendment and strike of its own row, its events and their points."""

from __future__ import annotations

import json

from sqlalchemy import Connection, and_, or_, select

from electrolog.record import schema, sheets
from electrolog.record.journal import Entry


def corrections(connection: Connection, electrode_id: int) -> list[Entry]:
    """Oldest first; of rows that were struck too."""
    journal = schema.journal
    own = {sheets.ELECTRODES.name: [electrode_id]}
    for sheet in sheets.EVENTS:
        table = schema.tables[sheet.name]
        own[sheet.name] = list(
            connection.execute(select(table.c.id).where(table.c.electrode_id == electrode_id)).scalars()
        )
    own[sheets.POINTS.name] = own[sheets.CALIBRATIONS.name]
    places = [and_(journal.c.sheet == name, journal.c.row_id.in_(ids)) for name, ids in own.items() if ids]
    query = select(journal).where(schema.CORRECTIONS, or_(*places)).order_by(journal.c.seq)
    return [Entry(**{**row, "change": json.loads(row["change"])}) for row in connection.execute(query).mappings()]
