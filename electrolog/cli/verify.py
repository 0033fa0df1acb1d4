from __future__ import annotations

import typer

from electrolog.cli.options import Json
from electrolog.cli.session import lab_of


def command(ctx: typer.Context, json: Json = False) -> None:
    """Replay the journal against the record, and name whatever was changed, added or removed behind its back.

    electrolog verify
    """
    from electrolog.show import journal

    found = lab_of(ctx).verify()
    journal.answer_verification(found, json)
    if not found.whole:
        raise typer.Exit(1)
