from __future__ import annotations

from typing import Annotated

import typer

from electrolog.cli.options import Json, Waveform
from electrolog.cli.planned import AsOf
from electrolog.cli.session import lab_of


def command(
    ctx: typer.Context,
    label: Annotated[str, typer.Argument(metavar="PROBE", help="Which probe.")],
    analyte: Annotated[str, typer.Option("--analyte", "-a", help="By which analyte's calibrations.")],
    waveform: Waveform = None,
    first: Annotated[bool, typer.Option("--first", help="Against the first calibration, not the one before.")] = False,
    at: AsOf = "now",
    json: Json = False,
) -> None:
    """Why did this probe get worse? The evidence for and against each cause, and what to do next at the bench.

    electrolog diagnose B07-01 --analyte dopamine
    """
    from electrolog.show import diagnosis
    from electrolog.show.progress import working

    lab = lab_of(ctx)
    with working("looking for causes"):
        found = lab.diagnose(label, analyte, waveform, first=first, moment=lab.moment(at))
    diagnosis.answer(found, lab.zone, json)
