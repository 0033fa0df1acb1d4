from __future__ import annotations

from typing import Annotated

import typer

from electrolog.cli.logging import log_and_answer
from electrolog.cli.options import At, Json, Labels, Note, Yes


def command(
    ctx: typer.Context,
    labels: Labels,
    reason: Annotated[str, typer.Option("--reason", "-r", help="A word of the list 'retirement reason'.")],
    at: At = "now",
    note: Note = None,
    yes: Yes = False,
    json: Json = False,
) -> None:
    """Log the end of a probe's use. It stays in every statistic: leaving it out would flatter the survivors.

    electrolog retire B9-01 --reason fouled
    """
    log_and_answer(ctx, "retirements", labels, {"at": at, "reason": reason, "note": note}, yes, json)
