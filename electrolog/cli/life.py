from __future__ import annotations

from typing import Annotated

import typer

from electrolog.cli.options import Csv, Json
from electrolog.cli.session import lab_of


def command(
    ctx: typer.Context,
    label: Annotated[str, typer.Argument(metavar="PROBE", help="Its label.")],
    json: Json = False,
    csv: Csv = False,
) -> None:
    """One probe's life as a timeline. Each event's number is what `amend` and `strike` take.

    electrolog life B07-01
    """
    from electrolog.show import life

    lab = lab_of(ctx)
    probe, events = lab.life(lab.labels([label])[0])
    life.answer(probe, events, json, csv)
