from __future__ import annotations

from typing import Annotated

import typer

from electrolog.cli.logging import log_and_answer
from electrolog.cli.options import By, Json, Labels, Medium, Note, Waveform, Yes


def command(
    ctx: typer.Context,
    labels: Labels,
    duration: Annotated[str, typer.Option("--for", help="How long: 4h, 90min, 2h10min")],
    setting: Annotated[str, typer.Option("--setting", "-s", help="in-vivo, slice, flow-cell, or a word of the lab's")],
    start: Annotated[
        str | None,
        typer.Option("--start", "--at", metavar="TIME", help="When it began (default: so that it ends now)."),
    ] = None,
    waveform: Waveform = None,
    medium: Medium = None,
    subject: Annotated[str | None, typer.Option("--subject", help="The lab's own code of the preparation.")] = None,
    recording: Annotated[str | None, typer.Option("--recording", help="Name of the recording.")] = None,
    by: By = None,
    note: Note = None,
    yes: Yes = False,
    json: Json = False,
) -> None:
    """Log time in tissue or flow. Cautions: an explanted probe is a biohazard and a sharp.

    electrolog expose B9-01 --for 4h --setting in-vivo --waveform triangle --subject S-031
    """
    values = {
        "duration_min": duration,
        "start": start or f"{duration} ago",
        "setting": setting,
        "waveform": waveform,
        "medium": medium,
        "subject": subject,
        "recording": recording,
        "by": by,
        "note": note,
    }
    log_and_answer(ctx, "exposures", labels, values, yes, json)
