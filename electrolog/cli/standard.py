from __future__ import annotations

from typing import Annotated

import typer

from electrolog.cli.logging import say
from electrolog.cli.options import Json, Note
from electrolog.cli.session import lab_of


def command(
    ctx: typer.Context,
    label: Annotated[str, typer.Argument(metavar="STANDARD", help="Its label.")],
    analyte: Annotated[str, typer.Argument(metavar="ANALYTE", help="What is in it.")],
    concentration: Annotated[str, typer.Argument(metavar="CONCENTRATION", help="10mM, 500uM")],
    prepared: Annotated[str, typer.Option("--prepared", metavar="TIME", help="When it was made.")] = "now",
    uncertainty: Annotated[
        str | None, typer.Option("--uncertainty", help="Standard uncertainty as a share: 2%, 0.02")
    ] = None,
    diluent: Annotated[str | None, typer.Option("--diluent", help="What it is dissolved in.")] = None,
    expires: Annotated[str | None, typer.Option("--expires", metavar="TIME", help="Use-by.")] = None,
    note: Note = None,
    json: Json = False,
) -> None:
    """Log a standard solution. Amines oxidise in air within hours to days: give its use-by.

    electrolog standard S-48-DA dopamine 10mM --uncertainty 2% --diluent "0.1 M acid"
    """
    values = {
        "standard": label,
        "analyte": analyte,
        "prepared_at": prepared,
        "concentration_um": concentration,
        "relative_uncertainty": uncertainty,
        "diluent": diluent,
        "expires_at": expires,
        "note": note,
    }
    entered = lab_of(ctx).log_plain("standards", {name: text for name, text in values.items() if text is not None})
    say([entered], json)
