from __future__ import annotations

from pathlib import Path
from typing import Annotated

import typer

from electrolog.cli.options import Analyte, Csv, Json
from electrolog.cli.planned import AsOf, Project
from electrolog.cli.session import lab_of
from electrolog.errors import InputError


def command(
    ctx: typer.Context,
    plan: Annotated[
        Path | None,
        typer.Argument(
            metavar="[PLAN.csv]", help="label,start,duration,analyte,waveform,setting and, if wanted, needs,project"
        ),
    ] = None,
    typed: Annotated[
        list[str] | None, typer.Option("--planned", metavar="LABEL=START,DURATION", help="A run, instead of a file.")
    ] = None,
    analyte: Analyte = None,
    waveform: Annotated[str | None, typer.Option("--waveform", "-w", help="Of the typed runs.")] = None,
    setting: Annotated[str | None, typer.Option("--setting", "-s", help="Of the typed runs.")] = None,
    needs: Annotated[str, typer.Option("--needs", help="Of the typed runs: the smallest signal to be seen.")] = "",
    project: Project = "",
    gap: Annotated[str, typer.Option("--gap", help="From one run of a probe to its next, at least.")] = "1h",
    at: AsOf = "now",
    json: Json = False,
    csv: Csv = False,
) -> None:
    """Which probe for which planned run, so that the odds that all succeed are greatest; and what can't be served.

    electrolog assign week.csv --gap 2h

    electrolog assign --planned Mon=2026-02-02T09:00,2h -a dopamine -w triangle -s in-vivo
    """
    from electrolog.answers.plan import plan_of, read_plan
    from electrolog.answers.plan import typed as read_typed
    from electrolog.show import assignment
    from electrolog.show.progress import working
    from electrolog.units import MINUTES, parse_quantity

    if (plan is None) == (not typed):
        raise InputError("which runs? accepted: a plan's file, or --planned once for each run")
    lab = lab_of(ctx)
    if plan is not None:
        rows = read_plan(plan, lab.zone)
    else:
        shared = {"analyte": analyte, "waveform": waveform, "setting": setting, "needs": needs, "project": project}
        rows = plan_of(((text, {**shared, **read_typed(text)}) for text in typed or []), lab.zone)
    turnaround = parse_quantity(gap, MINUTES, "gap")
    with working("giving runs to probes"):
        found = lab.assign(rows, turnaround_min=turnaround, moment=lab.moment(at))
    assignment.answer(found, lab.zone, json, csv)
