from __future__ import annotations

from typing import Annotated

import typer

from electrolog.cli.options import Json
from electrolog.cli.session import lab_of


def command(
    ctx: typer.Context,
    where: Annotated[str, typer.Argument(metavar="WHERE", help="A new file, or the URL of an empty database.")],
    json: Json = False,
) -> None:
    """Copy the whole record to another place, on any engine, and prove it equal. The old one stays as it was.

    electrolog --db lab.db move shared.db
    """
    from electrolog.show import keeping
    from electrolog.show.progress import working

    with working("copying the record"):
        done = lab_of(ctx).move(where)
    keeping.answer_moved(done, json)
