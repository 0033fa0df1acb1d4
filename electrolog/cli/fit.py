from __future__ import annotations

from typing import Annotated

import typer

from electrolog.cli.options import ChartOption, Json, Plain
from electrolog.cli.recording import FigureFile
from electrolog.cli.session import lab_of


def command(
    ctx: typer.Context,
    analyte: Annotated[str, typer.Option("--analyte", "-a", help="Whose cohort.")],
    fresh: Annotated[bool, typer.Option("--fresh", help="Fit again, whatever is kept.")] = False,
    figure: FigureFile = None,
    chart: ChartOption = False,
    plain: Plain = False,
    json: Json = False,
) -> None:
    """How this lab's probes foul, as its record has taught: shapes, half-lives, settings, cleanings, bad days.

    electrolog fit --analyte dopamine
    """
    from electrolog.show import fits
    from electrolog.show.progress import working
    from electrolog.show.terminal import Drawing, drawing

    lab = lab_of(ctx)
    with working("fitting the cohort"):
        found = lab.cohort_fit(analyte, fresh=fresh)
    if figure is not None:
        from electrolog.show.cohort_figure import draw

        draw(figure, found, lab.fan(analyte))
    fits.answer(found, json)
    how = Drawing.NONE if json else drawing(chart, plain)
    if how is not Drawing.NONE:
        from electrolog.show import losses

        losses.answer(lab.typical_losses(analyte), found.shapes, how)
