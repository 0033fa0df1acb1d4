from __future__ import annotations

from typing import Annotated

import typer

from electrolog.cli.logging import log_and_answer
from electrolog.cli.options import At, Json, Labels, Note, Yes


def command(
    ctx: typer.Context,
    labels: Labels,
    method: Annotated[str, typer.Option("--method", "-m", help="A word of the list 'cleaning method'.")],
    at: At = "now",
    duration: Annotated[str | None, typer.Option("--for", help="How long: 10min")] = None,
    note: Note = None,
    yes: Yes = False,
    json: Json = False,
) -> None:
    """Log a cleaning. Do the post-calibration first: a cleaning before it hides the run's own loss.

    electrolog clean B9-01,B9-02 --method isopropanol --for 10min
    """
    values = {"at": at, "method": method, "duration_min": duration, "note": note}
    log_and_answer(ctx, "cleanings", labels, values, yes, json)
