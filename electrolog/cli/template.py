from __future__ import annotations

from pathlib import Path
from typing import Annotated

import typer

from electrolog.cli.session import lab_of
from electrolog.show.text import safe
from electrolog.units import CONCENTRATION_UM, parse_quantity


def command(
    ctx: typer.Context,
    file: Annotated[Path, typer.Argument(metavar="FILE.xlsx", help="The book to make.")],
    points: Annotated[
        str | None, typer.Option("--points", metavar="LIST", help="Concentrations: 0,250nM,0.5uM,1uM")
    ] = None,
) -> None:
    """Make an empty book with a column for each value, which `adopt` reads without a question.

    electrolog template calibrations.xlsx --points 0,250nM,500nM,1uM
    """
    asked = [parse_quantity(part, CONCENTRATION_UM, "points") for part in points.split(",")] if points else []
    lab_of(ctx, create=True).write_template(file, asked)
    typer.echo(f"{safe(file)}: fill in Calibrations and Runs, then: electrolog adopt {safe(file.name)}")
