from __future__ import annotations

from typing import Annotated

import typer

from electrolog.cli.add import split
from electrolog.cli.options import Json, Why, Yes
from electrolog.cli.session import lab_of, once_confirmed


def command(
    ctx: typer.Context,
    kind: Annotated[str, typer.Argument(metavar="KIND", help="calibration, point, exposure, probe, batch, …")],
    name: Annotated[str, typer.Argument(metavar="NAME", help="Its label, or the number that `life` shows.")],
    values: Annotated[list[str], typer.Argument(metavar="COLUMN=VALUE...", help="An empty value: unknown.")],
    why: Why = "",
    yes: Yes = False,
    json: Json = False,
) -> None:
    """Correct a value. The old one, who, when and the reason are kept in the journal.

    electrolog amend exposure 12 duration_min=4h --why "typed minutes for hours"

    electrolog amend point C0042/3 current_na=6.2 --why "misread the plot"
    """
    from electrolog.show import corrections

    lab, changes = lab_of(ctx), dict(split(text) for text in values)
    done = once_confirmed(lambda confirmed: lab.amend(kind, name, changes, why, confirmed=confirmed), yes)
    corrections.answer(done, json)
