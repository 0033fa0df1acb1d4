from __future__ import annotations

from typing import Annotated

import typer

from electrolog.cli.options import Csv, Json
from electrolog.cli.session import lab_of


def command(
    ctx: typer.Context,
    last: Annotated[int, typer.Option("--last", "-n", help="How many of the newest entries; 0: all.", min=0)] = 20,
    json: Json = False,
    csv: Csv = False,
) -> None:
    """What was done to the record, by whom and why, newest last.

    electrolog journal --last 5
    """
    from electrolog.show import journal

    lab = lab_of(ctx)
    entries = lab.journal()
    chosen = entries[-last:] if last else entries
    journal.answer(chosen, lab.named(chosen), json, csv)
