from __future__ import annotations

from pathlib import Path
from typing import Annotated

import typer

from electrolog.cli.options import Json
from electrolog.cli.session import lab_of


def command(
    ctx: typer.Context,
    folder: Annotated[Path, typer.Argument(metavar="FOLDER", help="Where to write; made if it isn't there.")],
    json: Json = False,
) -> None:
    """Write an exchange folder: CSV files and a datapackage.json that describes them.

    electrolog export backup-2026-12
    """
    from electrolog.show import exchange

    exchange.answer_export(lab_of(ctx).export_folder(folder), json)
