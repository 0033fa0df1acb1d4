"""The report as one page that needs nothing else: of probes, or of the whole lab."""

from __future__ import annotations

from collections.abc import Sequence
from pathlib import Path
from typing import Any

from electrolog.answers.report import LabSheet, Origin, Planned, ProbeSheet
from electrolog.clock import shown_moment
from electrolog.show.lab_page import lab_context
from electrolog.show.page import CAUTIONS
from electrolog.show.pages import own_file, rendered
from electrolog.show.probe_page import probe_context
from electrolog.units import shown_concentration, shown_duration


def write_report(
    path: Path, title: str, made: Origin, probes: Sequence[ProbeSheet], lab: LabSheet | None, planned: Planned | None
) -> None:
    path.write_text(report(title, made, probes, lab, planned), encoding="utf-8", newline="\n")


def report(
    title: str, made: Origin, probes: Sequence[ProbeSheet], lab: LabSheet | None, planned: Planned | None
) -> str:
    return rendered(
        "report.html",
        title=title,
        origin=_origin(made),
        planned="" if planned is None else _planned(planned),
        probes=[probe_context(one, f"p{place}") for place, one in enumerate(probes)],
        lab=None if lab is None else lab_context(lab),
        cautions=CAUTIONS,
        style=own_file("style.css"),
        script=None if lab is None else own_file("report.js"),
    )


def _origin(made: Origin) -> str:
    methods = ", ".join(f"{what} by {name}" for what, name in made.methods.items())
    return (
        f"Made by {made.made_by} on {shown_moment(made.made_at)} with electrolog {made.version} "
        f"from {_short(made.record)}; journal at entry {made.entries}, head {made.head[:16]}; {methods}."
    )


def _short(record: str) -> str:
    """A file by its name: where it lies on somebody's disk is nobody else's business."""
    return record if "://" in record else Path(record).name


def _planned(planned: Planned) -> str:
    run, needs = planned.run, planned.demands.needs_um
    parts: list[Any] = [f"{shown_duration(run.run_min)} {run.setting}", run.analyte, run.waveform]
    parts += [] if needs is None else [f"down to {shown_concentration(needs)}"]
    parts += [f"project {planned.demands.project}"] if planned.demands.project else []
    return ", ".join(parts)
