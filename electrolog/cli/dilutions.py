from __future__ import annotations

from typing import Annotated

import typer

from electrolog.cli.options import Csv, Json
from electrolog.cli.session import lab_of
from electrolog.units import CONCENTRATION_UM, VOLUME_ML, parse_quantity


def command(
    ctx: typer.Context,
    stock: Annotated[str, typer.Argument(metavar="STOCK", help="A standard's label, or a concentration: 10mM")],
    wanted: Annotated[
        list[str] | None, typer.Argument(metavar="[CONCENTRATION...]", help="Default: 0.25uM 0.5uM 1uM 2uM")
    ] = None,
    volume: Annotated[str, typer.Option("--volume", help="Of each.")] = "50mL",
    smallest: Annotated[str, typer.Option("--smallest", help="Least volume to pipette.")] = "10uL",
    json: Json = False,
    csv: Csv = False,
) -> None:
    """Plan the dilutions of a flow-cell calibration from a stock: which volumes give which concentration.

    electrolog dilutions S-48-DA 0.25uM 0.5uM 1uM 2uM --volume 50mL

    It handles hazardous powders and acids as mere numbers: the lab's own protocol says how they are handled.
    """
    from electrolog.measure.dilution_plan import USUAL_UM
    from electrolog.show import standards

    found = [parse_quantity(text, CONCENTRATION_UM, "concentration") for text in wanted or []] or list(USUAL_UM)
    volumes = [parse_quantity(text, VOLUME_ML, name) for text, name in ((volume, "volume"), (smallest, "smallest"))]
    standards.answer_plan(lab_of(ctx).plan_dilutions(stock, found, *volumes), json, csv)
