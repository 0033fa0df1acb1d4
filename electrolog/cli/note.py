from __future__ import annotations

from typing import Annotated

import typer

from electrolog.cli.logging import log_and_answer
from electrolog.cli.options import At, Json, Labels, Yes
from electrolog.errors import InputError


def command(
    ctx: typer.Context,
    labels: Labels,
    text: Annotated[str, typer.Argument(metavar="TEXT", help="The remark, in quotes.")],
    at: At = "now",
    yes: Yes = False,
    json: Json = False,
) -> None:
    """Log a remark on a probe; it stands in its timeline.

    electrolog note B9-01 "tip looks bent under the 40x"
    """
    if not text.strip():
        raise InputError("a note without words; accepted: a remark in quotes")
    log_and_answer(ctx, "inspections", labels, {"at": at, "note": text}, yes, json)
