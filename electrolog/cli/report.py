from __future__ import annotations

from dataclasses import dataclass, replace
from datetime import datetime
from pathlib import Path
from typing import TYPE_CHECKING, Annotated

import typer

from electrolog.cli.options import Json
from electrolog.cli.planned import AsOf, Labels, Needs, Project, RunLimits, asking, run_of
from electrolog.cli.session import lab_of
from electrolog.errors import InputError, shortened

if TYPE_CHECKING:
    from electrolog.answers.report import Planned
    from electrolog.lab import Lab
    from electrolog.show.progress import Tell
    from electrolog.show.report_page import Told


def command(
    ctx: typer.Context,
    out: Annotated[Path, typer.Option("--out", "-o", metavar="FILE.html", help="Where the page is written.")],
    labels: Labels = None,
    batch: Annotated[str | None, typer.Option("--batch", "-b", help="Every probe of the batch.")] = None,
    whole: Annotated[bool, typer.Option("--lab", help="The lab's state in place of probes.")] = False,
    analyte: Annotated[str | None, typer.Option("--analyte", "-a", help="Of a planned run.")] = None,
    waveform: Annotated[str | None, typer.Option("--waveform", "-w", help="Of a planned run.")] = None,
    setting: Annotated[str | None, typer.Option("--setting", "-s", help="Of a planned run.")] = None,
    run: Annotated[
        str | None,
        typer.Option(
            "--run", metavar="LENGTH|PLAN.csv", help="A planned run's length, or a plan as `assign` reads it."
        ),
    ] = None,
    needs: Needs = None,
    project: Project = "",
    limit: RunLimits = None,
    backtest: Annotated[
        bool, typer.Option("--backtest", help="With --lab: test the forecasts anew (minutes).")
    ] = False,
    at: AsOf = "now",
    json: Json = False,
) -> None:
    """A report as one self-contained page: of probes, of a batch, of a plan's runs, or of the whole lab.

    electrolog report B07-01 --out B07-01.html

    electrolog report --lab --out lab.html
    """
    from electrolog.show.machine import print_json
    from electrolog.show.progress import working
    from electrolog.show.report_page import write_report
    from electrolog.show.tables import print_lines

    lab = lab_of(ctx)
    moment = lab.moment(at)
    asked = _asked(lab, labels, batch, whole, moment, _plan(run))
    if asked.plan is None:
        asked = replace(asked, planned=_planned(analyte, waveform, setting, run, (needs, project, limit)))
    elif any((analyte, waveform, setting, needs, project, limit)):
        raise InputError("the plan says of each run what it is; accepted with a plan: --lab, --at and --out")
    if not out.absolute().parent.is_dir():  # said before the work, not after it
        raise InputError(f"out: the folder '{shortened(str(out.parent))}' isn't there; accepted: one that is")
    if backtest and not whole:
        raise InputError("a backtest is the lab's: accepted with --lab")
    with working("making the report") as tell:
        told = _told(lab, asked, backtest, tell)
        write_report(out, told)
    size, made = out.stat().st_size, told.made
    if json:
        print_json({"file": str(out), "bytes": size, "journal": {"entries": made.entries, "head": made.head}})
    else:
        print_lines(f"wrote {out}, {size / 1000:.0f} kB; journal at entry {made.entries}, head {made.head[:16]}")


@dataclass(frozen=True)
class _Asked:
    """What the report is to be of."""

    title: str
    names: list[str]
    whole: bool
    moment: datetime
    plan: Path | None
    planned: Planned | None = None


def _plan(run: str | None) -> Path | None:
    """A file's name in place of a length."""
    path = None if run is None else Path(run)
    return path if path is not None and (path.suffix.casefold() == ".csv" or path.is_file()) else None


def _asked(
    lab: Lab, labels: list[str] | None, batch: str | None, whole: bool, moment: datetime, plan: Path | None
) -> _Asked:
    """Raises InputError unless the report is of one thing."""
    from electrolog.show.tables import named

    if plan is not None and not whole:
        if labels or batch is not None:
            raise InputError("a plan's runs are given to whichever probes serve them best; accepted with it: --lab")
        return _Asked(f"Planned runs: {plan.stem}", [], False, moment, plan)
    names = _chosen(lab, labels, batch, whole)
    title = "The lab" if whole else f"Batch {batch}" if batch else f"Probe{'s' * (len(names) > 1)} {named(names, 5)}"
    return _Asked(title, names, whole, moment, plan)


def _told(lab: Lab, asked: _Asked, backtest: bool, tell: Tell) -> Told:
    from electrolog.answers.plan import read_plan
    from electrolog.show.report_page import Told

    week, probes = None, lab.probe_sheets(asked.names, asked.planned, asked.moment) if asked.names else []
    if asked.plan is not None:
        tell("giving runs to probes", 0)
        week, serving = lab.week_sheet(read_plan(asked.plan, lab.zone), asked.moment)
        probes = [] if asked.whole else serving
    state = lab.lab_sheet(asked.planned, asked.moment, backtest=backtest, progress=tell) if asked.whole else None
    return Told(asked.title, lab.origin(asked.moment), probes, state, asked.planned, week)


def _chosen(lab: Lab, labels: list[str] | None, batch: str | None, whole: bool) -> list[str]:
    """Raises InputError unless it is one thing: probes, a batch, or the lab."""
    if sum((bool(labels), batch is not None, whole)) != 1:
        raise InputError(
            "a report of what? accepted: labels, or --batch B, or --lab, or --run PLAN.csv",
            "electrolog shelf lists them",
        )
    if whole:
        return []
    if labels:
        return lab.labels(labels)
    known = [row["batch"] for row in lab.rows("batches")]
    spelled = {name.casefold(): name for name in known}.get((batch or "").casefold())
    if spelled is None:
        from electrolog.errors import unknown

        raise unknown("batch", batch or "", known)
    found = [row["electrode"] for row in lab.rows("electrodes") if row["batch"] == spelled]
    if not found:
        raise InputError(f"batch {spelled} has no probe; `electrolog new --batch {spelled}` makes some")
    return found


def _planned(
    analyte: str | None,
    waveform: str | None,
    setting: str | None,
    run: str | None,
    more: tuple[str | None, str, list[str] | None],
) -> Planned | None:
    """Raises InputError where a run is described by halves."""
    parts = {"--analyte": analyte, "--waveform": waveform, "--setting": setting, "--run": run}
    if not any(parts.values()):
        return None
    if analyte is None or waveform is None or setting is None or run is None:
        missing = ", ".join(name for name, value in parts.items() if value is None)
        raise InputError(f"a planned run lacks {missing}; accepted: all of {', '.join(parts)}, or none of them")
    from electrolog.answers.judging import demands
    from electrolog.answers.report import Planned

    asked = asking(*more)
    return Planned(
        run_of(analyte, waveform, setting, run), demands(asked["needs_um"], asked["project"], asked["limits"])
    )
