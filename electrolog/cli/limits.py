from __future__ import annotations

from typing import Annotated

import typer

from electrolog.cli.options import Analyte, Csv, Json
from electrolog.cli.session import lab_of
from electrolog.errors import InputError, unknown


def command(
    ctx: typer.Context,
    action: Annotated[str, typer.Argument(metavar="[list|set|unset|adopt]", help="What to do.")] = "list",
    rule: Annotated[str | None, typer.Argument(metavar="[RULE]", help="Which limit.")] = None,
    value: Annotated[str | None, typer.Argument(metavar="[VALUE]", help="With its unit: 60%, 50nM, 24h")] = None,
    analyte: Analyte = None,
    project: Annotated[str | None, typer.Option("--project", help="For this project only.")] = None,
    note: Annotated[str | None, typer.Option("--note", help="Where the limit comes from.")] = None,
    why: Annotated[str, typer.Option("--why", help="Of unset: the reason.")] = "",
    json: Json = False,
    csv: Csv = False,
) -> None:
    """What the lab demands of a probe. Nothing is assumed: a limit that isn't set gives `undetermined`.

    electrolog limits

    electrolog limits set least-share-left 60%

    electrolog limits adopt oldest-calibration
    """
    from electrolog.show import limits

    lab = lab_of(ctx)
    if action == "list":
        limits.answer_all(lab.limits(), json, csv)
    elif action == "set":
        if rule is None or value is None:
            raise InputError("which limit, and what value? accepted: such as `limits set least-share-left 60%`")
        limits.answer([lab.set_limit(rule, value, analyte=analyte, project=project, note=note)], json, csv)
    elif action == "adopt":
        limits.answer(lab.adopt_limits([rule] if rule else []), json, csv)
    elif action == "unset":
        if rule is None:
            raise InputError("which limit? accepted: such as `limits unset least-share-left`")
        lab.unset_limit(rule, analyte=analyte, project=project, reason=why)
        limits.answer([one for one in lab.limits() if one.rule.name == rule], json, csv)
    else:
        raise unknown("action of limits", action, ("list", "set", "unset", "adopt"))
