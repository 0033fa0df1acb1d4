from __future__ import annotations

from typing import Annotated

import typer

from electrolog.cli.options import Json
from electrolog.cli.session import lab_of
from electrolog.errors import InputError
from electrolog.units import CURRENT_NA, FRACTION, parse_quantity


def command(
    ctx: typer.Context,
    calibration: Annotated[str, typer.Argument(metavar="CALIBRATION", help="By which calibration: C0042")],
    currents: Annotated[
        list[str], typer.Argument(metavar="CURRENT...", help="Of the unknown; replicates: 5.2nA 5.4nA or 5.2nA,5.4nA")
    ],
    confidence: Annotated[str, typer.Option("--confidence", help="Of the interval: 95%, 0.95")] = "0.95",
    json: Json = False,
) -> None:
    """Read the concentration of an unknown off a calibration, with its interval.

    electrolog concentration C0042 5.2nA,5.4nA
    """
    from electrolog.show import concentrations

    values = [parse_quantity(part, CURRENT_NA, "current") for text in currents for part in text.split(",")]
    share = parse_quantity(confidence, FRACTION, "confidence")
    if not 0 < share < 1:
        raise InputError(f"confidence: {confidence} is out of range; accepted: above 0 and below 1, such as 95%")
    concentrations.answer(lab_of(ctx).read_off(calibration, values, share), json)
