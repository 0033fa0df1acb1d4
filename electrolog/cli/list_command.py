from __future__ import annotations

from typing import Annotated

import typer

from electrolog.cli.options import Csv, Json
from electrolog.cli.session import lab_of
from electrolog.errors import unknown

_SHEETS = ("analytes", "waveforms", "batches", "standards")


def command(
    ctx: typer.Context,
    kind: Annotated[str, typer.Argument(metavar="KIND", help="words, analytes, waveforms, batches, standards")],
    json: Json = False,
    csv: Csv = False,
) -> None:
    """The lab's words, analytes, waveforms, batches or standards.

    electrolog list waveforms
    """
    from electrolog.record.sheets import BY_NAME, WORD_KINDS
    from electrolog.show import listing

    lab = lab_of(ctx)
    if kind == "words" or kind in WORD_KINDS:
        kinds = WORD_KINDS if kind == "words" else (kind,)
        rows = [{"kind": one, "term": word} for one in kinds for word in lab.words(one)]
        listing.answer(rows, ("kind", "term"), json, csv)
    elif kind in _SHEETS:
        columns = [column.name for column in BY_NAME[kind].columns]
        listing.answer([{name: row[name] for name in columns} for row in lab.rows(kind)], columns, json, csv)
    else:
        raise unknown("list", kind, ["words", *_SHEETS, *WORD_KINDS])
