from __future__ import annotations

from typing import Annotated

import typer

from electrolog.cli.logging import log_and_answer
from electrolog.cli.options import At, Json, Labels, Note, Yes


def command(
    ctx: typer.Context,
    labels: Labels,
    material: Annotated[str, typer.Option("--material", "-m", help="Film: a word of the list 'coating material'.")],
    at: At = "now",
    method: Annotated[str | None, typer.Option("--method", help="How it was put on: dip, electrodeposition, …")] = None,
    potential: Annotated[str | None, typer.Option("--potential", help="Potential held: 1V")] = None,
    duration: Annotated[str | None, typer.Option("--for", help="How long: 30s, 2min")] = None,
    concentration: Annotated[str | None, typer.Option("--bath", help="Share by weight in the bath: 5%")] = None,
    layers: Annotated[str | None, typer.Option("--layers", help="Number of layers.")] = None,
    cure_temperature: Annotated[str | None, typer.Option("--cure-at", help="Curing temperature: 70C")] = None,
    cure: Annotated[str | None, typer.Option("--cure-for", help="Curing time: 10min")] = None,
    note: Note = None,
    yes: Yes = False,
    json: Json = False,
) -> None:
    """Log a coating, for one probe or several.

    electrolog coat B9-01..B9-06 -m PFSA --method dip --layers 3 --cure-at 70C --cure-for 10min
    """
    values = {
        "at": at,
        "material": material,
        "method": method,
        "potential_v": potential,
        "duration_s": duration,
        "concentration_wt_pct": concentration,
        "layers": layers,
        "cure_temperature_c": cure_temperature,
        "cure_min": cure,
        "note": note,
    }
    log_and_answer(ctx, "coatings", labels, values, yes, json)
