from __future__ import annotations

from pathlib import Path
from typing import Annotated

import typer

from electrolog.cli import recording as shared
from electrolog.cli.options import At, By, Json, Medium, Note, Waveform, Yes
from electrolog.cli.session import lab_of


def command(
    ctx: typer.Context,
    probe: shared.Probe,
    stage: shared.Stage,
    analyte: shared.AnalyteName,
    file: Annotated[Path, typer.Argument(metavar="FILE", help="CSV, NPY or HDF5 with time_s and current_na.")],
    concentrations: shared.Concentrations = None,
    waveform: Waveform = None,
    at: At = "now",
    standard: shared.Standard = None,
    medium: Medium = None,
    temperature: shared.Temperature = None,
    rig: shared.Rig = None,
    by: By = None,
    injections: shared.Injections = None,
    plateau: shared.PlateauPart = "0.5-0.95",
    baseline: Annotated[
        int, typer.Option("--baseline", metavar="DEGREE", help="Of the drift's polynomial: 0 to 5")
    ] = 2,
    edge: shared.Edge = 4.0,
    negative: shared.Negative = False,
    leave_out: shared.LeaveOut = None,
    rate: Annotated[
        float | None, typer.Option("--rate", metavar="HZ", help="Samples per second, where the file has no times.")
    ] = None,
    weights: shared.Weights = "equal",
    through_zero: shared.ThroughZero = False,
    figure: shared.FigureFile = None,
    look: shared.Look = False,
    name: shared.Name = None,
    note: Note = None,
    yes: Yes = False,
    json: Json = False,
) -> None:
    """Log a calibration from a flow-cell recording: drift taken off, injections found, their plateaus as points.

    electrolog trace B9-01 pre DA run-17.csv 0.25uM 0.5uM 1uM 2uM -w triangle --standard S-48-DA --figure run-17.png

    Look first with --look. What is found wrongly is set by hand (--injections, --plateau, --baseline, --edge,
    --leave-out); every choice is kept with the calibration.
    """
    from electrolog.answers.signals import from_trace
    from electrolog.measure.trace import TraceSettings
    from electrolog.show.progress import working

    typed, spans = shared.concentrations_of(concentrations, injections)
    settings = TraceSettings(spans, baseline, shared.part(plateau, "plateau"), edge, negative)
    with working("reading the recording"):
        recorded = from_trace(file, typed, settings, rate_hz=rate, left_out=leave_out or ())
    values = {
        "electrode": probe,
        "stage": stage,
        "analyte": analyte,
        "waveform": waveform,
        "at": at,
        "standard": standard,
        "medium": medium,
        "temperature_c": temperature,
        "rig": rig,
        "by": by,
        "calibration": name,
        "note": note,
    }
    wanted = shared.Wanted(values, weights, through_zero, figure, look, yes, json)
    shared.log_or_show(lab_of(ctx), recorded, wanted)
