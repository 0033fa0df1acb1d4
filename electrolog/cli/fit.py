from __future__ import annotations

from typing import Annotated

import typer

from electrolog.cli.options import Json
from electrolog.cli.session import lab_of


def command(
    ctx: typer.Context,
    analyte: Annotated[str, typer.Option("--analyte", "-a", help="Whose cohort.")],
    fresh: Annotated[bool, typer.Option("--fresh", help="Fit again, whatever is kept.")] = False,
    json: Json = False,
) -> None:
    """How this lab's probes foul, as its record has taught: shapes, half-lives, settings, cleanings, bad days.

    electrolog fit --analyte dopamine
    """
    from electrolog.show import fits

    fits.answer(lab_of(ctx).cohort_fit(analyte, fresh=fresh), json)
