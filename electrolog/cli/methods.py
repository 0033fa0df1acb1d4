from __future__ import annotations

from typing import Annotated

import typer

from electrolog.cli.options import Csv, Json, Waveform
from electrolog.cli.session import lab_of


def command(
    ctx: typer.Context,
    analyte: Annotated[str, typer.Option("--analyte", "-a", help="Analyte, by name or abbreviation.")],
    labels: Annotated[
        list[str] | None, typer.Argument(metavar="[PROBE...]", help="Labels, lists or ranges (default: every one).")
    ] = None,
    waveform: Waveform = None,
    json: Json = False,
    csv: Csv = False,
) -> None:
    """Write the methods paragraph of a paper, and with --csv its supplementary table: numbers, not advice.

    electrolog methods B07-01..B07-03 --analyte dopamine
    """
    from electrolog.show import methods
    from electrolog.show.progress import working

    with working("gathering what was done"):
        found = lab_of(ctx).methods(labels or (), analyte, waveform)
    methods.answer(found, json, csv)
