from __future__ import annotations

from pathlib import Path
from typing import Annotated

import typer

from electrolog.cli import recording as shared
from electrolog.cli.options import At, By, Json, Medium, Note, Waveform, Yes
from electrolog.cli.session import lab_of
from electrolog.units import POTENTIAL_V, parse_quantity


def command(
    ctx: typer.Context,
    probe: shared.Probe,
    stage: shared.Stage,
    analyte: shared.AnalyteName,
    file: Annotated[Path, typer.Argument(metavar="FILE", help="CSV, NPY or HDF5: a row per scan, nA.")],
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
    background: Annotated[
        str, typer.Option("--background-window", metavar="FROM-TO", help="Seconds before an injection.")
    ] = "5-0.5",
    steady: Annotated[
        bool, typer.Option("--steady-background", help="Take each background as it was, without its drift.")
    ] = False,
    oxidation: Annotated[
        str | None, typer.Option("--oxidation", help="Take the points at this potential: 0.62V")
    ] = None,
    reduction: Annotated[str | None, typer.Option("--reduction", help="Of the reduction peak: -200mV")] = None,
    charging: Annotated[
        str | None, typer.Option("--charging-at", help="State the background current there (default: at the peak).")
    ] = None,
    edge: shared.Edge = 4.0,
    negative: shared.Negative = False,
    leave_out: shared.LeaveOut = None,
    weights: shared.Weights = "equal",
    through_zero: shared.ThroughZero = False,
    figure: shared.FigureFile = None,
    look: shared.Look = False,
    name: shared.Name = None,
    note: Note = None,
    yes: Yes = False,
    json: Json = False,
) -> None:
    """Log a calibration from a sheet of scans: background taken off, voltammograms, peaks, points.

    electrolog scans B9-01 pre DA run-17.npy 0.25uM 0.5uM 1uM 2uM -w triangle --standard S-48-DA --figure run-17.png

    Potentials and times that the file doesn't say follow from the waveform. Look first with --look; every choice is
    kept with the calibration.
    """
    from electrolog.answers.signals import from_scans
    from electrolog.measure.scans import ScanSettings
    from electrolog.measure.trace import TraceSettings
    from electrolog.show.progress import working

    typed, spans = shared.concentrations_of(concentrations, injections)
    settings = ScanSettings(
        trace=TraceSettings(spans, plateau=shared.part(plateau, "plateau"), edge_s=edge, turned=negative),
        background_s=shared.part(background, "background"),
        drifting=not steady,
        oxidation_v=_volts(oxidation, "oxidation"),
        reduction_v=_volts(reduction, "reduction"),
        charging_v=_volts(charging, "charging"),
    )
    lab = lab_of(ctx)
    sweep = lab.sweep(probe, analyte, waveform)
    with working("reading the sheet of scans"):
        recorded = from_scans(file, typed, settings, sweep=sweep, left_out=leave_out or ())
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
    shared.log_or_show(lab, recorded, shared.Wanted(values, weights, through_zero, figure, look, yes, json))


def _volts(text: str | None, what: str) -> float | None:
    return None if text is None else parse_quantity(text, POTENTIAL_V, what)
