from __future__ import annotations

from typing import Annotated

import typer

from electrolog.cli.options import Json


def command(
    ctx: typer.Context,
    new: Annotated[str, typer.Argument(metavar="NEW", help="A new file for what can be saved.")],
    json: Json = False,
) -> None:
    """Save what can be saved of a damaged file: every row again that its journal still proves.

    electrolog rescue saved.db
    """
    from electrolog.lab import rescue
    from electrolog.show import keeping
    from electrolog.show.progress import working

    with working("saving what the journal proves"):
        done = rescue(ctx.obj.db, new)
    keeping.answer_rescued(done, json)
