from __future__ import annotations

from pathlib import Path
from typing import Annotated

import typer

from electrolog.cli.options import Json
from electrolog.cli.session import lab_of


def command(
    ctx: typer.Context,
    folder: Annotated[Path, typer.Argument(metavar="FOLDER", help="Where to write; made if it isn't there.")],
    parquet: Annotated[
        bool, typer.Option("--parquet", help="Parquet instead, for a big lab: typed columns, read in a moment.")
    ] = False,
    json: Json = False,
) -> None:
    """Write an exchange folder: CSV files and a datapackage.json that describes them.

    electrolog export backup-2026-12

    electrolog export tables --parquet
    """
    from electrolog.show import exchange

    lab = lab_of(ctx)
    exchange.answer_export(lab.export_parquet(folder) if parquet else lab.export_folder(folder), json)
