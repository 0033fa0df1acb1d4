"""What others did to the same entry a short while ago: whoever corrects it next is told before it is done again."""

from __future__ import annotations

import json
from collections.abc import Collection
from datetime import timedelta
from typing import Any

from sqlalchemy import Connection, select

from electrolog.clock import shown_moment
from electrolog.errors import DoubtfulEntry, shortened
from electrolog.record import schema
from electrolog.record.journal import Writer

LATELY = timedelta(days=1)


def refuse_unseen(writer: Writer, sheet: str, row_id: int, ordinal: int | None, columns: Collection[str]) -> None:
    """Raises DoubtfulEntry where another person lately amended one of these columns of this row."""
    told = [
        said for entry in _amendments(writer, sheet, row_id) if (said := _said(entry, ordinal, columns)) is not None
    ]
    if told:
        raise DoubtfulEntry(
            f"somebody else amended this lately: {'; '.join(told)}", told, "if yours is to stand, add --yes"
        )


def _amendments(writer: Writer, sheet: str, row_id: int) -> list[Any]:
    table = schema.journal
    query = select(table).where(
        table.c.sheet == sheet, table.c.row_id == row_id, table.c.action == "amend", table.c.who != writer.who
    )
    recent = query.where(table.c.at > writer.at - LATELY).order_by(table.c.seq.desc()).limit(3)
    return list(writer.connection.execute(recent))


def _said(entry: Any, ordinal: int | None, columns: Collection[str]) -> str | None:
    change = json.loads(entry.change)
    same = [name for name in change["after"] if name in columns]
    if not same or change.get("ordinal") != ordinal:
        return None
    what = ", ".join(_step(name, change["before"][name], change["after"][name]) for name in same)
    return f"{shortened(entry.who)} changed {what} at {shown_moment(entry.at)} ({shortened(entry.reason)})"


def _step(name: str, before: Any, after: Any) -> str:
    """Of a link the row numbers would tell nobody anything."""
    if name.endswith("_id"):
        return name.removesuffix("_id")
    return f"{name} from {_plain(before)} to {_plain(after)}"


def _plain(value: Any) -> str:
    return "unknown" if value is None else shortened(str(value), 40)


def struck_by(connection: Connection, seq: int) -> str:
    """Who struck a row, when and why."""
    entry = connection.execute(select(schema.journal).where(schema.journal.c.seq == seq)).one()
    return f"by {shortened(entry.who)} at {shown_moment(entry.at)}: {shortened(entry.reason)}"
