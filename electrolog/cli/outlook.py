from __future__ import annotations

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
    run_of,
)
from electrolog.cli.session import lab_of


def command(
    ctx: typer.Context,
    analyte: AnalyteOfRun,
    waveform: WaveformOfRun,
    setting: Setting,
    run: RunLength,
    labels: Labels = None,
    runs: Annotated[
        int | None, typer.Option("--runs", help="Planned for the month (default: as many as in the last 30 days).")
    ] = None,
    needs: Needs = None,
    project: Project = "",
    limit: RunLimits = None,
    at: AsOf = "now",
    json: Json = False,
    csv: Csv = False,
) -> None:
    """When each probe will have to be retired, and how many to make this month for runs of that kind.

    electrolog outlook --analyte dopamine --waveform triangle --setting in-vivo --run 2h --runs 20
    """
    from electrolog.show import outlook
    from electrolog.show.progress import working

    lab = lab_of(ctx)
    with working("looking ahead"):
        found = lab.outlook(
            run_of(analyte, waveform, setting, run),
            lab.labels(labels) if labels else None,
            planned_runs=runs,
            **asking(needs, project, limit),
            moment=lab.moment(at),
        )
    outlook.answer(found, lab.zone, json, csv)
