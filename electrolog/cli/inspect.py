from __future__ import annotations

from typing import Annotated

import typer

from electrolog.cli.logging import log_and_answer
from electrolog.cli.options import At, Json, Labels, Note, Yes


def command(
    ctx: typer.Context,
    labels: Labels,
    at: At = "now",
    length: Annotated[str | None, typer.Option("--length", help="Exposed length: 100um")] = None,
    seal: Annotated[str | None, typer.Option("--seal", help="Whether the seal holds: yes, no")] = None,
    background: Annotated[str | None, typer.Option("--background", help="Background charging current: 450nA")] = None,
    noise: Annotated[str | None, typer.Option("--noise", help="Standard deviation of the signal at rest: 80pA")] = None,
    note: Note = None,
    yes: Yes = False,
    json: Json = False,
) -> None:
    """Log what a look or a test showed.

    electrolog inspect B9-01..B9-06 --length 100um --seal yes
    """
    values = {
        "at": at,
        "exposed_length_um": length,
        "seal_ok": seal,
        "background_na": background,
        "noise_na": noise,
        "note": note,
    }
    log_and_answer(ctx, "inspections", labels, values, yes, json)
