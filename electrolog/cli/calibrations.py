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
    """Calibrations with all their figures, oldest first.

    electrolog calibrations B07-01
    """
    from electrolog.show import calibrations

    lab = lab_of(ctx)
    calibrations.answer_list(lab.readings(lab.labels(labels), analyte=analyte, waveform=waveform), json, csv)
