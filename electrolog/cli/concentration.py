from __future__ import annotations

from typing import Annotated

import typer

from electrolog.cli.options import Json
from electrolog.cli.session import lab_of
from electrolog.units import CURRENT_NA, parse_quantity


def command(
    ctx: typer.Context,
    calibration: Annotated[str, typer.Argument(metavar="CALIBRATION", help="By which calibration: C0042")],
    currents: Annotated[
        list[str], typer.Argument(metavar="CURRENT...", help="Of the unknown; replicates: 5.2nA 5.4nA or 5.2nA,5.4nA")
    ],
    confidence: Annotated[float, typer.Option("--confidence", help="Of the interval.")] = 0.95,
    json: Json = False,
) -> None:
    """Read the concentration of an unknown off a calibration, with its interval.

    electrolog concentration C0042 5.2nA,5.4nA
    """
    from electrolog.show import concentrations

    values = [parse_quantity(part, CURRENT_NA, "current") for text in currents for part in text.split(",")]
    concentrations.answer(lab_of(ctx).read_off(calibration, values, confidence), json)
