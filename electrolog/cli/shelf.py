from __future__ import annotations

from typing import TYPE_CHECKING, Annotated

import typer

from electrolog.cli.options import Analyte, ChartOption, Csv, Json, Plain
from electrolog.cli.planned import AsOf, Needs, Project, RunLimits, asking, run_of
from electrolog.cli.session import lab_of
from electrolog.errors import InputError

if TYPE_CHECKING:
    from electrolog.answers.asked import Run


def command(
    ctx: typer.Context,
    batch: Annotated[str | None, typer.Option("--batch", "-b", help="Batches that begin so.")] = None,
    coating: Annotated[str | None, typer.Option("--coating", help="Coating that begins so; none for bare.")] = None,
    maker: Annotated[str | None, typer.Option("--maker", help="Maker that begins so.")] = None,
    state: Annotated[
        str | None, typer.Option("--state", help="untested, calibrated, used, renewed, retired, usable (default), all")
    ] = None,
    search: Annotated[str | None, typer.Option("--search", help="Anything ever written of the probe.")] = None,
    analyte: Analyte = None,
    waveform: Annotated[str | None, typer.Option("--waveform", "-w", help="Of the planned run.")] = None,
    setting: Annotated[str | None, typer.Option("--setting", "-s", help="Of the planned run.")] = None,
    run: Annotated[str | None, typer.Option("--run", help="A planned run's length: ranks the shelf for it.")] = None,
    needs: Needs = None,
    project: Project = "",
    limit: RunLimits = None,
    at: AsOf = "now",
    chart: ChartOption = False,
    plain: Plain = False,
    json: Json = False,
    csv: Csv = False,
) -> None:
    """Every probe with state, age, exposure, last calibration and share left; or, for a planned run, best first.

    electrolog shelf --batch B07 --state used

    electrolog shelf --analyte dopamine --waveform triangle --setting in-vivo --run 2h
    """
    from electrolog.answers.shelf import Filter
    from electrolog.show.progress import working

    lab = lab_of(ctx)
    moment = lab.moment(at)
    planned = _planned(analyte, waveform, setting, run)
    wanted = Filter(
        batch=batch, coating=coating, maker=maker, state=state, search=search, analyte=None if planned else analyte
    )
    if planned is None:
        from electrolog.show import shelf
        from electrolog.show.terminal import drawing

        with working("looking through the shelf"):
            found = lab.shelf(wanted, moment)
        shelf.answer(found, json, csv, drawing(chart, plain))
        return
    from electrolog.show import ranking

    with working("judging the probes"):
        labels = None if wanted == Filter() else [probe.electrode for probe in lab.shelf(wanted, moment)]
        ranked = lab.ranking(planned, labels, **asking(needs, project, limit), moment=moment)
    ranking.answer(ranked, planned, json, csv)


def _planned(analyte: str | None, waveform: str | None, setting: str | None, run: str | None) -> Run | None:
    """Raises InputError where a run is described by halves: a list would not be the answer to what was asked."""
    parts = {"--analyte": analyte, "--waveform": waveform, "--setting": setting, "--run": run}
    if not any((waveform, setting, run)):
        return None
    missing = [name for name, value in parts.items() if value is None]
    if missing or analyte is None or waveform is None or setting is None or run is None:
        raise InputError(
            f"a planned run lacks {', '.join(missing)}; accepted: all of {', '.join(parts)}, or none for the plain list"
        )
    return run_of(analyte, waveform, setting, run)
