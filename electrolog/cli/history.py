from __future__ import annotations

from enum import StrEnum
from typing import TYPE_CHECKING, Annotated

import typer

from electrolog.cli.options import Analyte, ChartOption, Csv, Json, Labels, Plain, Waveform
from electrolog.cli.recording import FigureFile
from electrolog.cli.session import lab_of

if TYPE_CHECKING:
    from electrolog.answers.course import Ahead


class Against(StrEnum):
    EXPOSURE = "exposure"
    TIME = "time"


def command(
    ctx: typer.Context,
    labels: Labels,
    analyte: Analyte = None,
    waveform: Waveform = None,
    against: Annotated[Against, typer.Option("--against", help="What the chart runs along.")] = Against.EXPOSURE,
    ahead: Annotated[str, typer.Option("--ahead", help="How far the forecast looks: 4h")] = "4h",
    setting: Annotated[
        str | None, typer.Option("--setting", "-s", help="Where the forecast takes place (default: as last time).")
    ] = None,
    figure: FigureFile = None,
    chart: ChartOption = False,
    plain: Plain = False,
    json: Json = False,
    csv: Csv = False,
) -> None:
    """A probe's sensitivity against its exposure, with what is left of its reference calibration and what is ahead.

    At a terminal it is drawn: calibrations with their intervals, the forecast's band, the limit, coatings, cleanings
    and runs.

    electrolog history B07-01

    electrolog history B07-01 --chart --against time
    """
    from electrolog.show import courses, history
    from electrolog.show.progress import working
    from electrolog.show.terminal import Drawing, drawing

    lab = lab_of(ctx)
    names = lab.labels(labels)
    how = Drawing.NONE if json or csv else drawing(chart, plain)
    if how is not Drawing.NONE or figure is not None:
        with working("looking at the probe's course"):
            found = lab.courses(names, analyte, waveform, ahead=_ahead(ahead, setting))
        if figure is not None:
            from electrolog.show.course_figure import draw

            draw(figure, found)
        courses.answer(found, how, against is Against.TIME)
    readings = lab.readings(names, analyte=analyte, waveform=waveform)
    history.answer(readings, json, csv, how is Drawing.PLAIN, [] if readings else lab.readings(names))


def _ahead(length: str, setting: str | None) -> Ahead:
    from electrolog.answers.course import Ahead
    from electrolog.units import MINUTES, parse_quantity

    return Ahead(setting, parse_quantity(length, MINUTES, "ahead"))
