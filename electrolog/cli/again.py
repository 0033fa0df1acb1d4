from __future__ import annotations

from typing import Annotated

import typer

from electrolog.cli.logging import say
from electrolog.cli.options import Json, Yes
from electrolog.cli.points import parsed
from electrolog.cli.session import lab_of, once_confirmed


def command(
    ctx: typer.Context,
    label: Annotated[str, typer.Argument(metavar="PROBE", help="One label, a list or a range: B1-02  B1-02..B1-05")],
    pairs: Annotated[
        list[str] | None,
        typer.Argument(metavar="[CONCENTRATION:CURRENT...]", help="Where the last entry was a calibration."),
    ] = None,
    at: Annotated[
        str | None, typer.Option("--at", metavar="TIME", help="Default: now; an exposure keeps the start of the last.")
    ] = None,
    yes: Yes = False,
    json: Json = False,
) -> None:
    """Log your last entry once more, for another probe.

    electrolog again B9-02 0:0.1 0.25uM:3.1 0.5uM:6.0 1uM:12.0 2uM:23.8
    """
    lab = lab_of(ctx)
    points = parsed(pairs) if pairs else []
    entered = once_confirmed(lambda confirmed: lab.again([label], points, at=at, confirmed=confirmed), yes)
    if entered[0].sheet != "calibrations":
        say(entered, json)
        return
    from electrolog.show import calibrations

    calibrations.answer(lab.readings_of([str(one.values["calibration"]) for one in entered]), json)
