from __future__ import annotations

from pathlib import Path
from typing import Annotated

import typer

from electrolog.cli.options import Json
from electrolog.cli.session import lab_of


def command(
    ctx: typer.Context,
    folder: Annotated[Path, typer.Argument(metavar="FOLDER", help="A folder of the exchange files.")],
    json: Json = False,
) -> None:
    """Read an exchange folder: every row or none. The same folder again changes nothing.

    electrolog --db lab.db import demo/lab
    """
    from electrolog.show import exchange
    from electrolog.show.progress import working

    with working("reading the folder") as tell:
        report = lab_of(ctx, create=True).import_folder(folder, tell)
    exchange.answer_import(report, json)
