from __future__ import annotations

from typing import Annotated

import typer

from electrolog.cli.add import split
from electrolog.cli.options import Json
from electrolog.cli.session import lab_of


def command(
    ctx: typer.Context,
    logins: Annotated[
        list[str] | None, typer.Argument(metavar="LOGIN=ROLE...", help="Whom to admit, as read, bench or steward.")
    ] = None,
    json: Json = False,
) -> None:
    """On a server: make the roles read, bench and steward, admit logins to them, and say who holds which.

    read asks and forecasts; bench also logs, and amends its own entries of the day; steward also keeps limits and
    word lists, amends and strikes any entry, and admits others.

    electrolog --db postgresql+psycopg://lab-server/electrolog roles wren=bench finch=steward
    """
    from electrolog.show import keeping

    keeping.answer_roles(lab_of(ctx).roles(dict(split(text) for text in logins or ())), json)
