from __future__ import annotations

from typing import Annotated

import typer

from electrolog.cli.options import Csv, Json, Plain
from electrolog.cli.recording import FigureFile
from electrolog.cli.session import lab_of


def command(
    ctx: typer.Context,
    analyte: Annotated[str, typer.Option("--analyte", "-a", help="Whose cohort.")],
    cuts: Annotated[int, typer.Option("--cuts", help="How often the cohort is fitted anew on the way.")] = 4,
    figure: FigureFile = None,
    plain: Plain = False,
    json: Json = False,
    csv: Csv = False,
) -> None:
    """Whether the forecasts would have been right on this lab's own past, beside simpler ways; --csv lists each.

    Every later calibration is hidden and forecast from what was known before it; the cohort's fit sees only the past.

    electrolog backtest --analyte dopamine
    """
    from electrolog.show import backtests
    from electrolog.show.progress import working

    with working("forecasting the lab's own past") as tell:
        found = lab_of(ctx).backtest(analyte, cuts=cuts, progress=tell)
    if figure is not None:
        from electrolog.show.backtest_figure import draw

        draw(figure, found)
    backtests.answer(found, json, csv, plain)
