from __future__ import annotations

from typing import Annotated

import typer

from electrolog.answers.kinds import By
from electrolog.cli.options import Csv, Json, Waveform
from electrolog.cli.recording import FigureFile
from electrolog.cli.session import lab_of


def command(
    ctx: typer.Context,
    by: Annotated[By, typer.Option("--between", help="What distinguishes the groups.")],
    analyte: Annotated[str, typer.Option("--analyte", "-a", help="By which analyte's calibrations.")],
    waveform: Waveform = None,
    after: Annotated[str, typer.Option("--after", help="Hours in vivo of the share left.")] = "10h",
    more: Annotated[int, typer.Option("--more", help="How many more probes to deal out over the groups.")] = 6,
    figure: FigureFile = None,
    json: Json = False,
    csv: Csv = False,
) -> None:
    """Do kinds of probes differ, how surely, how many more would tell, and where they would tell most.

    electrolog compare --between coating --analyte dopamine
    """
    from electrolog.show import comparison
    from electrolog.show.progress import working
    from electrolog.units import HOURS, parse_quantity

    after_h = parse_quantity(after, HOURS, "after")
    lab = lab_of(ctx)
    with working("comparing the groups"):
        found = lab.compare(by, analyte, waveform, after_h=after_h, more=more)
    if figure is not None:
        from electrolog.show.groups_figure import draw

        draw(figure, found, lab.groups(by, analyte, waveform))
    comparison.answer(found, json, csv)
