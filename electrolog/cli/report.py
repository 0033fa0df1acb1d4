from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING, Annotated

import typer

from electrolog.cli.options import Json
from electrolog.cli.planned import AsOf, Labels, Needs, Project, RunLimits, asking, run_of
from electrolog.cli.session import lab_of
from electrolog.errors import InputError

if TYPE_CHECKING:
    from datetime import datetime

    from electrolog.answers.report import Planned
    from electrolog.lab import Lab


def command(
    ctx: typer.Context,
    out: Annotated[Path, typer.Option("--out", "-o", metavar="FILE.html", help="Where the page is written.")],
    labels: Labels = None,
    batch: Annotated[str | None, typer.Option("--batch", "-b", help="Every probe of the batch.")] = None,
    whole: Annotated[bool, typer.Option("--lab", help="The lab's state in place of probes.")] = False,
    analyte: Annotated[str | None, typer.Option("--analyte", "-a", help="Of a planned run.")] = None,
    waveform: Annotated[str | None, typer.Option("--waveform", "-w", help="Of a planned run.")] = None,
    setting: Annotated[str | None, typer.Option("--setting", "-s", help="Of a planned run.")] = None,
    run: Annotated[str | None, typer.Option("--run", help="A planned run's length: adds the verdicts for it.")] = None,
    needs: Needs = None,
    project: Project = "",
    limit: RunLimits = None,
    at: AsOf = "now",
    json: Json = False,
) -> None:
    """A report as one self-contained page: of probes, of a batch, or of the whole lab; to read, print and keep.

    electrolog report B07-01 --out B07-01.html

    electrolog report --lab --out lab.html
    """
    from electrolog.show.machine import print_json
    from electrolog.show.progress import working
    from electrolog.show.report_page import write_report
    from electrolog.show.tables import named, print_lines

    lab = lab_of(ctx)
    moment = lab.moment(at)
    planned = _planned(analyte, waveform, setting, run, (needs, project, limit))
    names = _chosen(lab, labels, batch, whole, moment)
    title = "The lab" if whole else f"Batch {batch}" if batch else f"Probe{'s' * (len(names) > 1)} {named(names, 5)}"
    with working("making the report"):
        probes = lab.probe_sheets(names, planned, moment) if names else []
        state = lab.lab_sheet(planned, moment) if whole else None
        made = lab.origin(moment)
        write_report(out, title, made, probes, state, planned)
    size = out.stat().st_size
    if json:
        print_json({"file": str(out), "bytes": size, "journal": {"entries": made.entries, "head": made.head}})
    else:
        print_lines(f"wrote {out}, {size / 1000:.0f} kB; journal at entry {made.entries}, head {made.head[:16]}")


def _chosen(lab: Lab, labels: list[str] | None, batch: str | None, whole: bool, moment: datetime) -> list[str]:
    """Raises InputError unless the report is of one thing: probes, a batch, or the lab."""
    if sum((bool(labels), batch is not None, whole)) != 1:
        raise InputError("a report of what? accepted: labels, or --batch B, or --lab", "electrolog shelf lists them")
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
