from __future__ import annotations

from pathlib import Path
from typing import Annotated

import typer

from electrolog.cli.options import Json
from electrolog.cli.session import lab_of


def command(
    ctx: typer.Context,
    folder: Annotated[Path, typer.Argument(metavar="FOLDER", help="Where backups are kept; made if it isn't there.")],
    keep: Annotated[int | None, typer.Option("--keep", min=1, help="Remove the oldest beyond so many.")] = None,
    json: Json = False,
) -> None:
    """Write a backup while others go on, check it, and name it by the journal's head.

    electrolog backup backups --keep 30
    """
    from electrolog.show import keeping
    from electrolog.show.progress import working

    with working("writing and checking a backup"):
        done = lab_of(ctx).back_up(folder, keep)
    keeping.answer_backup(done, json)
    if done.faults:
        raise typer.Exit(1)
