"""The options that say which run is planned, for the commands that judge."""

from __future__ import annotations

from datetime import datetime
from typing import TYPE_CHECKING, Annotated, TypedDict

import typer

from electrolog.errors import InputError, shortened

if TYPE_CHECKING:
    from electrolog.answers.asked import Run
    from electrolog.lab import Lab

Labels = Annotated[list[str] | None, typer.Argument(metavar="[PROBE...]", help="Labels, lists or ranges.")]
AnalyteOfRun = Annotated[str, typer.Option("--analyte", "-a", help="What is to be detected.")]
WaveformOfRun = Annotated[str, typer.Option("--waveform", "-w", help="With which waveform.")]
Setting = Annotated[str, typer.Option("--setting", "-s", help="Where: in-vivo, slice, flow-cell, …")]
RunLength = Annotated[str, typer.Option("--run", help="For how long: 4h, 90min")]
AsOf = Annotated[str, typer.Option("--at", metavar="TIME", help="As of which moment (default: now).")]
Needs = Annotated[str | None, typer.Option("--needs", help="The smallest signal to be seen: 50nM")]
Project = Annotated[str, typer.Option("--project", help="Whose limits hold.")]
RunLimits = Annotated[list[str] | None, typer.Option("--limit", help="For this run only: RULE=VALUE")]


class Asking(TypedDict):
    """What the run asks beyond the lab's limits, as the lab's methods take it."""

    needs_um: float | None
    project: str
    limits: dict[str, str]


def asking(needs: str | None, project: str, limit: list[str] | None) -> Asking:
    from electrolog.units import CONCENTRATION_UM, parse_quantity

    needs_um = None if needs is None else parse_quantity(needs, CONCENTRATION_UM, "needs")
    return {"needs_um": needs_um, "project": project, "limits": dict(_rule_and_value(text) for text in limit or [])}


def _rule_and_value(text: str) -> tuple[str, str]:
    rule, equals, value = text.partition("=")
    if not (equals and rule.strip() and value.strip()):
        raise InputError(f"limit: '{shortened(text)}' is no pair; accepted: RULE=VALUE, such as least-share-left=60%")
    return rule.strip(), value.strip()


def run_of(analyte: str, waveform: str, setting: str, run: str) -> Run:
    from electrolog.answers.asked import Run
    from electrolog.units import MINUTES, parse_quantity

    return Run(analyte, waveform, setting, parse_quantity(run, MINUTES, "run"))


def chosen(lab: Lab, labels: list[str] | None, everything: bool, moment: datetime) -> list[str]:
    """The probes asked about. Raises InputError unless they are named, or all are meant, and not both."""
    if bool(labels) == everything:
        raise InputError("which probes? accepted: labels, or --all", "electrolog shelf lists them")
    if labels:
        return lab.labels(labels)
    from electrolog.answers.shelf import Filter

    return [probe.electrode for probe in lab.shelf(Filter(), moment)]
