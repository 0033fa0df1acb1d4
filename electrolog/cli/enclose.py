from __future__ import annotations

from pathlib import Path
from typing import Annotated

import typer

from electrolog.cli.options import Json, Waveform
from electrolog.cli.session import lab_of


def command(
    ctx: typer.Context,
    file: Annotated[Path, typer.Argument(metavar="RECORDING", help="An .nwb file, or .csv, .npy, .h5")],
    analyte: Annotated[str, typer.Option("--analyte", "-a", help="What the run was to detect.")],
    probe: Annotated[
        str | None, typer.Option("--probe", "-p", help="Which probe recorded it, where the file doesn't tell.")
    ] = None,
    waveform: Waveform = None,
    convert: Annotated[
        bool, typer.Option("--convert", help="Also the current as a concentration with a band.")
    ] = False,
    series: Annotated[str | None, typer.Option("--series", help="Which current of an NWB file.")] = None,
    unit: Annotated[str, typer.Option("--unit", help="Of the concentration: uM or nM")] = "uM",
    setting: Annotated[
        str | None, typer.Option("--setting", "-s", help="Where the probe was, for a run that isn't logged.")
    ] = None,
    needs: Annotated[str | None, typer.Option("--needs", help="The smallest signal to be seen: 50nM")] = None,
    exposure: Annotated[int | None, typer.Option("--exposure", help="The run's number, as `life` shows it.")] = None,
    start: Annotated[
        str | None, typer.Option("--start", metavar="TIME", help="When a plain file's time is zero.")
    ] = None,
    rate: Annotated[float | None, typer.Option("--rate", help="Samples per second, of a file without times.")] = None,
    out: Annotated[Path | None, typer.Option("--out", help="Where to (default: RECORDING.enclosed beside it).")] = None,
    in_place: Annotated[bool, typer.Option("--in-place", help="Into this very NWB file, in one step.")] = False,
    again: Annotated[bool, typer.Option("--again", help="In place of the papers that were put in before.")] = False,
    json: Json = False,
) -> None:
    """Put a probe's papers into a recording: what it is, its calibrations, the factor in force, the verdict.

    An NWB file is copied first and never worked on; beside a .csv, .npy or .h5 file a folder of CSV tables is made.

    electrolog enclose B07-01_R1.nwb --analyte dopamine --convert
    """
    from electrolog.show import enclosures
    from electrolog.show.progress import working
    from electrolog.units import CONCENTRATION_UM, parse_quantity

    lab = lab_of(ctx)
    with working(f"putting papers into {file.name}"):
        found = lab.enclose(
            file,
            analyte,
            probe=probe,
            waveform=waveform,
            convert=convert,
            series=series,
            unit=unit,
            setting=setting,
            needs_um=None if needs is None else parse_quantity(needs, CONCENTRATION_UM, "needs"),
            exposure=exposure,
            start=None if start is None else lab.moment(start),
            rate_hz=rate,
            out=out,
            in_place=in_place,
            again=again,
        )
    enclosures.answer(found, file, json)
