from __future__ import annotations

from typing import Annotated

import typer

from electrolog.cli.logging import log_and_answer
from electrolog.cli.options import At, Json, Labels, Medium, Note, Waveform, Yes


def command(
    ctx: typer.Context,
    labels: Labels,
    at: At = "now",
    waveform: Waveform = None,
    duration: Annotated[str | None, typer.Option("--for", help="How long: 15min")] = None,
    medium: Medium = None,
    note: Note = None,
    yes: Yes = False,
    json: Json = False,
) -> None:
    """Log cycling before use, for one probe or several.

    electrolog condition B9-01..B9-06 --waveform triangle --for 20min --medium PBS
    """
    values = {"at": at, "waveform": waveform, "duration_min": duration, "medium": medium, "note": note}
    log_and_answer(ctx, "conditionings", labels, values, yes, json)
