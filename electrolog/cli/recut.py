from __future__ import annotations

from typing import Annotated

import typer

from electrolog.cli.logging import log_and_answer
from electrolog.cli.options import At, Json, Labels, Note, Yes


def command(
    ctx: typer.Context,
    labels: Labels,
    length: Annotated[str | None, typer.Option("--length", help="Exposed length afterwards: 75um")] = None,
    at: At = "now",
    note: Note = None,
    yes: Yes = False,
    json: Json = False,
) -> None:
    """Log that the carbon was trimmed anew.

    electrolog recut B9-01 --length 75um
    """
    log_and_answer(ctx, "recuts", labels, {"at": at, "exposed_length_um": length, "note": note}, yes, json)
