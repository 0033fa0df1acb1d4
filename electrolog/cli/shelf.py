from __future__ import annotations

from typing import Annotated

import typer

from electrolog.cli.options import Analyte, Csv, Json
from electrolog.cli.session import lab_of


def command(
    ctx: typer.Context,
    batch: Annotated[str | None, typer.Option("--batch", "-b", help="Batches that begin so.")] = None,
    coating: Annotated[str | None, typer.Option("--coating", help="Coating that begins so; none for bare.")] = None,
    maker: Annotated[str | None, typer.Option("--maker", help="Maker that begins so.")] = None,
    state: Annotated[
        str | None, typer.Option("--state", help="untested, calibrated, used, renewed, retired, usable (default)")
    ] = None,
    analyte: Analyte = None,
    search: Annotated[str | None, typer.Option("--search", help="Anything ever written of the probe.")] = None,
    json: Json = False,
    csv: Csv = False,
) -> None:
    """Every probe with state, age, exposure, last calibration and share left.

    electrolog shelf --batch B07 --state used
    """
    from electrolog.answers.shelf import Filter
    from electrolog.show import shelf

    wanted = Filter(batch=batch, coating=coating, maker=maker, state=state, analyte=analyte, search=search)
    shelf.answer(lab_of(ctx).shelf(wanted), json, csv)
