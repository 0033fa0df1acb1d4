from __future__ import annotations

from typing import Annotated

import typer

from electrolog.answers.quantities import Quantity
from electrolog.cli.options import Analyte, Csv, Json, Labels, Waveform
from electrolog.cli.recording import FigureFile
from electrolog.cli.session import lab_of


def command(
    ctx: typer.Context,
    labels: Labels,
    analyte: Analyte = None,
    waveform: Waveform = None,
    rig: Annotated[str | None, typer.Option("--rig", help="This rig only (default: a chart for each).")] = None,
    standard: Annotated[str | None, typer.Option("--standard", help="Measured with this check standard only.")] = None,
    of: Annotated[Quantity, typer.Option("--of", help="What is charted.")] = Quantity.SENSITIVITY,
    baseline: Annotated[
        int | None, typer.Option("--baseline", metavar="N", help="The first N readings set the limits (default: all).")
    ] = None,
    figure: FigureFile = None,
    json: Json = False,
    csv: Csv = False,
) -> None:
    """Control chart of a check probe or a check standard, per rig: individuals, moving range, EWMA and CUSUM.

    electrolog control CHECK-1 -a DA -w triangle --rig rig-1 --baseline 10 --figure rig-1.png
    """
    from electrolog.answers.controlling import Wanted
    from electrolog.show import control

    lab = lab_of(ctx)
    found = lab.control(lab.labels(labels), of, Wanted(analyte, waveform, rig, standard, baseline))
    if figure is not None:
        from electrolog.show.control_figure import draw

        draw(figure, found)
    control.answer(found, json, csv)
