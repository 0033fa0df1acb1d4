from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING, Annotated

import typer

from electrolog.cli.options import At, By, Json, Medium, Note, Waveform, Yes
from electrolog.cli.points import from_file, parsed
from electrolog.cli.recording import FigureFile, Name, ThroughZero, Weights
from electrolog.cli.session import lab_of, once_confirmed
from electrolog.errors import InputError

if TYPE_CHECKING:
    from electrolog.answers.calibrating import NewCalibration
    from electrolog.lab import Lab


def command(
    ctx: typer.Context,
    label: Annotated[str, typer.Argument(metavar="PROBE", help="Its label; - where a file names several.")],
    stage: Annotated[str, typer.Argument(metavar="STAGE", help="pre, interim or post")],
    analyte: Annotated[str, typer.Argument(metavar="ANALYTE", help="Name or abbreviation.")],
    pairs: Annotated[
        list[str] | None,
        typer.Argument(metavar="[CONCENTRATION:CURRENT...]", help="0:0.2 0.5uM:5.1,5.3 1uM:10.2 (µM and nA if bare)"),
    ] = None,
    waveform: Waveform = None,
    at: At = "now",
    points: Annotated[Path | None, typer.Option("--points", help="A CSV file of points instead.")] = None,
    standard: Annotated[str | None, typer.Option("--standard", help="Label of the standard.")] = None,
    medium: Medium = None,
    temperature: Annotated[str | None, typer.Option("--temperature", help="Of the buffer: 37C")] = None,
    rig: Annotated[str | None, typer.Option("--rig", help="Which rig.")] = None,
    by: By = None,
    noise: Annotated[str | None, typer.Option("--noise", help="Standard deviation of the signal at rest: 80pA")] = None,
    background: Annotated[str | None, typer.Option("--background", help="Background charging current: 450nA")] = None,
    oxidation: Annotated[str | None, typer.Option("--oxidation", help="Oxidation peak: 0.62V")] = None,
    reduction: Annotated[str | None, typer.Option("--reduction", help="Reduction peak: -200mV")] = None,
    factor: Annotated[str | None, typer.Option("--factor", help="Only the factor was kept: 12.4nA/uM")] = None,
    factor_se: Annotated[str | None, typer.Option("--factor-se", help="Its standard error.")] = None,
    weights: Weights = "equal",
    through_zero: ThroughZero = False,
    figure: FigureFile = None,
    name: Name = None,
    note: Note = None,
    yes: Yes = False,
    json: Json = False,
) -> None:
    """Log a calibration with all its raw points; answers at once with what they say.

    electrolog calibrate B9-01 pre DA 0:0.1 0.25uM:3.2 0.5uM:6.1,6.3 1uM:12.2 2uM:24.0 -w triangle --standard S-48-DA
    """
    from electrolog.answers.handling import Handling, with_handling
    from electrolog.measure.schemes import scheme

    if figure is not None:
        from electrolog.show.figures import refuse_undrawable

        refuse_undrawable(figure)

    values = {
        "stage": stage,
        "analyte": analyte,
        "waveform": waveform,
        "at": at,
        "standard": standard,
        "medium": medium,
        "temperature_c": temperature,
        "rig": rig,
        "by": by,
        "noise_na": noise,
        "background_na": background,
        "oxidation_peak_v": oxidation,
        "reduction_peak_v": reduction,
        "sensitivity_na_um": factor,
        "sensitivity_se_na_um": factor_se,
        "calibration": name,
        "note": with_handling(note, Handling(scheme(weights), through_zero)),
    }
    lab = lab_of(ctx)
    known = {column: text for column, text in values.items() if text is not None}
    new = _new(lab, known, label, _points(label, pairs or [], points, factor))
    entered = once_confirmed(lambda confirmed: lab.calibrate(new, confirmed=confirmed), yes)
    from electrolog.show import calibrations

    found = lab.readings_of([str(one.values["calibration"]) for one in entered])
    if figure is not None:
        from electrolog.show.line_figure import draw_calibrations

        draw_calibrations(figure, found)
    calibrations.answer(found, json)


def _points(
    label: str, pairs: list[str], path: Path | None, factor: str | None
) -> dict[str, list[tuple[float, float]]]:
    if (path is not None) + bool(pairs) + (factor is not None) != 1:
        raise InputError(
            "a calibration is its points, a file of points, or (of an old record) its factor; accepted: one of these",
            "such as: electrolog calibrate B9-01 pre DA 0:0.1 0.5uM:6.1 1uM:12.2 -w triangle",
        )
    if path is None:
        return {label: parsed(pairs)}
    by_probe = from_file(path)
    if "" in by_probe:
        if label == "-" or len(by_probe) > 1:
            raise InputError(f"{path.name}: has rows that name no electrode; accepted: its label in every row")
        return {label: by_probe[""]}
    if label != "-":
        raise InputError(f"{path.name}: names its electrodes itself; accepted: - in place of '{label}'")
    return by_probe


def _new(
    lab: Lab, known: dict[str, str], label: str, points: dict[str, list[tuple[float, float]]]
) -> list[NewCalibration]:
    from electrolog.answers.calibrating import NewCalibration

    made = []
    for electrode, pairs in points.items():
        waveform = known.get("waveform") or lab.usual_waveform(electrode, known["analyte"])
        made.append(NewCalibration({**known, "electrode": electrode, "waveform": waveform}, tuple(pairs)))
    return made
