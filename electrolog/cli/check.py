from __future__ import annotations

from pathlib import Path
from typing import Annotated

import typer

from electrolog.cli.options import Csv, Json
from electrolog.cli.planned import (
    AnalyteOfRun,
    AsOf,
    Labels,
    Needs,
    Project,
    RunLength,
    RunLimits,
    Setting,
    WaveformOfRun,
    asking,
    chosen,
    run_of,
)
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
    needs: Needs = None,
    project: Project = "",
    limit: RunLimits = None,
    page: Annotated[
        Path | None, typer.Option("--page", metavar="FILE.html", help="Write a page to pin at the rig as well.")
    ] = None,
    at: AsOf = "now",
    json: Json = False,
    csv: Csv = False,
) -> None:
    """Fit, recalibrate, retire or undetermined, before a run, with odds, reasons and the longest run that holds.

    Exit status: 0 all fit, 10 some to recalibrate, 20 some to retire, 30 some undetermined.

    electrolog check B07-01 --analyte dopamine --waveform triangle --setting in-vivo --run 4h --needs 50nM
    """
    from electrolog.show import checks
    from electrolog.show.progress import working

    lab = lab_of(ctx)
    moment = lab.moment(at)
    planned = run_of(analyte, waveform, setting, run)
    demands = asking(needs, project, limit)
    with working("judging the probes"):
        found = lab.check(chosen(lab, labels, everything, moment), planned, **demands, moment=moment)
    if page is not None:
        from electrolog.show.page import write_page

        write_page(page, found, planned, dict(demands), lab.origin(moment))
    checks.answer(found, planned, json, csv)
    raise typer.Exit(max((EXIT_STATUS[one.verdict.verdict] for one in found), default=0))
