from __future__ import annotations

from pathlib import Path
from typing import Annotated

import typer

from electrolog.cli.options import Json


def command(
    ctx: typer.Context,
    file: Annotated[Path, typer.Argument(metavar="BACKUP", help="A file that `backup` wrote.")],
    replace: Annotated[
        bool, typer.Option("--replace", help="Even over entries that the backup lacks; they are kept beside it.")
    ] = False,
    json: Json = False,
) -> None:
    """Put a backup in the record's place. What stood there is kept beside it, and nothing newer is lost unasked.

    electrolog --db lab.db restore backups/electrolog-1f0c7a52-20261201T060000Z-731-9b1e0c55d0a7f3e2.db
    """
    from electrolog.lab import restore
    from electrolog.show import keeping
    from electrolog.show.progress import working

    with working("putting the backup back"):
        done = restore(ctx.obj.db, file, replace=replace)
    keeping.answer_restored(done, json)
