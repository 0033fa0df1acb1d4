from __future__ import annotations

from typing import Annotated

import typer

from electrolog.cli.options import Csv, Json
from electrolog.cli.planned import AnalyteOfRun, AsOf, Labels, RunLength, Setting, WaveformOfRun, chosen, run_of
from electrolog.cli.session import lab_of


def command(
    ctx: typer.Context,
    analyte: AnalyteOfRun,
    waveform: WaveformOfRun,
    setting: Setting,
    run: RunLength,
    labels: Labels = None,
    everything: Annotated[bool, typer.Option("--all", help="Every probe that isn't retired.")] = False,
    quantiles: Annotated[str, typer.Option("--quantiles", help="Which quantiles.")] = "0.05,0.5,0.95",
    at: AsOf = "now",
    json: Json = False,
    csv: Csv = False,
) -> None:
    """What probes will still see after a run: quantiles of the true sensitivity, with what they rest on.

    electrolog forecast B07-01 --analyte dopamine --waveform triangle --setting in-vivo --run 4h
    """
    from electrolog.show import forecasts
    from electrolog.show.progress import working
    from electrolog.units import PLAIN, parse_quantity

    lab = lab_of(ctx)
    wanted = [parse_quantity(text, PLAIN, "quantiles") for text in quantiles.split(",")]
    moment = lab.moment(at)
    with working("forecasting"):
        found = lab.forecast(
            chosen(lab, labels, everything, moment), run_of(analyte, waveform, setting, run), wanted, moment
        )
    forecasts.answer(found, json, csv)
