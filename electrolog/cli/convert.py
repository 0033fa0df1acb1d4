from __future__ import annotations

from pathlib import Path
from typing import Annotated

import typer

from electrolog.cli.options import Json, Waveform
from electrolog.cli.session import lab_of
from electrolog.errors import InputError, shortened


def command(
    ctx: typer.Context,
    file: Annotated[Path, typer.Argument(metavar="FILE", help="Times and currents: .csv, .npy, .h5")],
    probe: Annotated[str, typer.Option("--probe", "-p", help="Which probe recorded it.")],
    analyte: Annotated[str, typer.Option("--analyte", "-a", help="What the current is of.")],
    waveform: Waveform = None,
    exposure: Annotated[int | None, typer.Option("--exposure", help="The run's number, as `life` shows it.")] = None,
    start: Annotated[str | None, typer.Option("--start", metavar="TIME", help="When its time is zero.")] = None,
    rate: Annotated[float | None, typer.Option("--rate", help="Samples per second, of a file without times.")] = None,
    background: Annotated[
        str | None, typer.Option("--background", metavar="START,END", help="Charging current then: 160nA,151nA")
    ] = None,
    out: Annotated[Path | None, typer.Option("--out", help="The result, a CSV file.")] = None,
    json: Json = False,
) -> None:
    """A recording's currents into concentrations with a 90 % band, by the sensitivity at each moment of the run.

    Columns of the file: time_s and current_na. Beside the result stands a JSON file with all that it rests on.

    electrolog convert R0017.csv --probe B07-01 --analyte dopamine --exposure 17
    """
    from electrolog.show import conversions
    from electrolog.show.progress import working

    lab = lab_of(ctx)
    labels = lab.labels([probe])
    if len(labels) != 1:
        raise InputError(f"probe: '{shortened(probe)}' names {len(labels)} probes; accepted: the one that recorded it")
    label = labels[0]
    result, account = conversions.targets(file, out)
    with working("converting the recording"):
        found = lab.convert(
            file,
            label,
            analyte,
            waveform or lab.usual_waveform(label, analyte),
            exposure=exposure,
            start=None if start is None else lab.moment(start),
            rate_hz=rate,
            background_na=None if background is None else pair_of(background),
        )
    conversions.write(found, result, account)
    conversions.answer(found, result, account, json)


def pair_of(text: str) -> tuple[float, float]:
    """`160nA,151nA`: at the recording's start and at its end."""
    from electrolog.units import CURRENT_NA, parse_quantity

    parts = text.split(",")
    if len(parts) != 2:
        raise InputError(f"background: '{shortened(text)}' is no pair; accepted: at start and end, such as 160nA,151nA")
    return parse_quantity(parts[0], CURRENT_NA, "background"), parse_quantity(parts[1], CURRENT_NA, "background")
