from __future__ import annotations

from typing import Annotated

import typer

from electrolog.cli.options import Json
from electrolog.cli.session import lab_of


def command(
    ctx: typer.Context,
    head: Annotated[
        str | None,
        typer.Option("--head", metavar="HASH", help="A head written down earlier: was anything cut off since?"),
    ] = None,
    json: Json = False,
) -> None:
    """Replay the journal against the record, and name whatever was changed, added or removed behind its back.

    electrolog verify
    """
    from electrolog.show import journal
    from electrolog.show.progress import working

    with working("replaying the journal"):
        found = lab_of(ctx).verify(head)
    journal.answer_verification(found, json)
    if not found.whole:
        raise typer.Exit(1)
