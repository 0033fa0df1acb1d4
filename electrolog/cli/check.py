from __future__ import annotations

from typing import Annotated

import typer

from electrolog.cli.add import split
from electrolog.cli.options import Csv, Json
from electrolog.cli.planned import AnalyteOfRun, AsOf, Labels, RunLength, Setting, WaveformOfRun, chosen, run_of
from electrolog.cli.session import lab_of

EXIT_STATUS = {"fit": 0, "recalibrate": 10, "retire": 20, "undetermined": 30}


def command(
    ctx: typer.Context,
    analyte: AnalyteOfRun,
    waveform: WaveformOfRun,
    setting: Setting,
    run: RunLength,
    labels: Labels = None,
    everything: Annotated[bool, typer.Option("--all", help="Every probe that isn't retired.")] = False,
    needs: Annotated[str | None, typer.Option("--needs", help="The smallest signal to be seen: 50nM")] = None,
    project: Annotated[str, typer.Option("--project", help="Whose limits hold.")] = "",
    limit: Annotated[list[str] | None, typer.Option("--limit", help="For this run only: RULE=VALUE")] = None,
    at: AsOf = "now",
    json: Json = False,
    csv: Csv = False,
) -> None:
    """Fit, recalibrate, retire or undetermined, before a run, with odds, reasons and the longest run that holds.

    Exit status: 0 all fit, 10 some to recalibrate, 20 some to retire, 30 some undetermined.

    electrolog check B07-01 --analyte dopamine --waveform triangle --setting in-vivo --run 4h --needs 50nM
    """
    from electrolog.show import checks
    from electrolog.units import CONCENTRATION_UM, parse_quantity

    lab = lab_of(ctx)
    moment = lab.moment(at)
    planned = run_of(analyte, waveform, setting, run)
    found = lab.check(
        chosen(lab, labels, everything, moment),
        planned,
        needs_um=None if needs is None else parse_quantity(needs, CONCENTRATION_UM, "needs"),
        project=project,
        limits=dict(split(text) for text in limit or []),
        moment=moment,
    )
    checks.answer(found, planned, json, csv)
    raise typer.Exit(max((EXIT_STATUS[one.verdict.verdict] for one in found), default=0))
