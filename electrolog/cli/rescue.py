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

    keeping.answer_rescued(rescue(ctx.obj.db, new), json)
