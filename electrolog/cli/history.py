from __future__ import annotations

import typer

from electrolog.cli.options import Analyte, Csv, Json, Labels, Waveform
from electrolog.cli.session import lab_of


def command(
    ctx: typer.Context,
    labels: Labels,
    analyte: Analyte = None,
    waveform: Waveform = None,
    json: Json = False,
    csv: Csv = False,
) -> None:
    """A probe's sensitivity against its exposure, with what is left of its reference calibration.

    electrolog history B07-01
    """
    from electrolog.show import history

    lab = lab_of(ctx)
    history.answer(lab.readings(lab.labels(labels), analyte=analyte, waveform=waveform), json, csv)
