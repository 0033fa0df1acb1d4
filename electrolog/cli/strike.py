from __future__ import annotations

from typing import Annotated

import typer

from electrolog.cli.options import Json, Why
from electrolog.cli.session import lab_of


def command(
    ctx: typer.Context,
    kind: Annotated[str, typer.Argument(metavar="KIND", help="calibration, point, exposure, cleaning, …")],
    name: Annotated[str, typer.Argument(metavar="NAME", help="Its label, or the number that `life` shows.")],
    why: Why = "",
    json: Json = False,
) -> None:
    """Take an entry out of every answer. It stays in the record, with who, when and the reason.

    electrolog strike calibration C0042 --why "wrong probe in the holder"
    """
    from electrolog.show import corrections

    corrections.answer(lab_of(ctx).strike(kind, name, why), json)
