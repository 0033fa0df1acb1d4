from __future__ import annotations

from typing import Annotated

import typer

from electrolog.cli.options import Analyte, ChartOption, Csv, Json, Labels, Plain, Waveform
from electrolog.cli.recording import FigureFile
from electrolog.cli.session import lab_of
from electrolog.errors import InputError, shortened
from electrolog.units import CONCENTRATION_UM, parse_quantity


def command(
    ctx: typer.Context,
    labels: Labels,
    analyte: Analyte = None,
    waveform: Waveform = None,
    detection: Annotated[bool, typer.Option("--detection", help="Detection limits by every recognised route.")] = False,
    expecting: Annotated[
        str | None, typer.Option("--expecting", metavar="FROM-TO", help="Signal to be recorded: 50nM-1uM")
    ] = None,
    figure: FigureFile = None,
    chart: ChartOption = False,
    plain: Plain = False,
    json: Json = False,
    csv: Csv = False,
) -> None:
    """Calibrations with all their figures, oldest first, and what speaks against them; drawn at a terminal.

    electrolog calibrations B07-01 --detection --expecting 50nM-1uM
    """
    from electrolog.show import calibrations, lines
    from electrolog.show.terminal import Drawing, drawing

    lab = lab_of(ctx)
    names = lab.labels(labels)
    found = lab.readings(names, analyte=analyte, waveform=waveform, expected_um=_expected(expecting))
    if figure is not None:
        from electrolog.show.line_figure import draw_calibrations

        draw_calibrations(figure, found)
    routes = {one.calibration: lab.detection(one) for one in found} if detection else {}
    calibrations.answer_list(found, json, csv, routes, [] if found else lab.readings(names))
    lines.answer(found, Drawing.NONE if json or csv else drawing(chart, plain))


def _expected(text: str | None) -> tuple[float, float] | None:
    if text is None:
        return None
    first, dash, last = text.partition("-")
    if not dash:
        raise InputError(f"expecting: '{shortened(text)}' is no range; accepted: lowest and highest, as in 50nM-1uM")
    low, high = (parse_quantity(part, CONCENTRATION_UM, "expecting") for part in (first, last))
    if not 0 <= low < high:
        raise InputError(f"expecting: '{shortened(text)}' is no range; accepted: the lower one first, as in 50nM-1uM")
    return low, high
