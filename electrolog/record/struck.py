"""Entries that were taken out of every answer, with the reason that was given."""

from __future__ import annotations

from collections.abc import Sequence

from sqlalchemy import select

from electrolog.record import schema
from electrolog.record.store import Connection


def struck_calibrations(connection: Connection, electrode_ids: Sequence[int]) -> list[tuple[str, str]]:
    """Label and reason, oldest first."""
    table, journal = schema.tables["calibrations"], schema.journal
    query = (
        select(table.c.calibration, journal.c.reason)
        .join(journal, table.c.struck == journal.c.seq)
        .where(table.c.electrode_id.in_(electrode_ids))
        .order_by(table.c.at, table.c.id)
    )
    return [(label, reason) for label, reason in connection.execute(query)]
