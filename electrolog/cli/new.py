from __future__ import annotations

from typing import Annotated

import typer

from electrolog.cli.options import Json
from electrolog.cli.session import lab_of


def command(
    ctx: typer.Context,
    labels: Annotated[list[str] | None, typer.Argument(metavar="[PROBE...]", help="Labels, lists or ranges.")] = None,
    count: Annotated[int | None, typer.Option("--count", "-n", help="How many, numbered after their batch.")] = None,
    batch: Annotated[str | None, typer.Option("--batch", "-b", help="Their batch; made if it isn't there.")] = None,
    length: Annotated[str | None, typer.Option("--length", help="Exposed length: 100um")] = None,
    diameter: Annotated[str | None, typer.Option("--diameter", help="Diameter of the exposed carbon: 7um")] = None,
    geometry: Annotated[str | None, typer.Option("--geometry", help="cylinder, disk, other")] = None,
    made_on: Annotated[str | None, typer.Option("--made-on", metavar="DATE", help="Of a new batch: when made.")] = None,
    made_by: Annotated[str | None, typer.Option("--made-by", help="Of a new batch: maker.")] = None,
    fibre: Annotated[str | None, typer.Option("--fibre", help="Of a new batch: carbon fibre.")] = None,
    fibre_diameter: Annotated[str | None, typer.Option("--fibre-diameter", help="Of a new batch.")] = None,
    insulation: Annotated[str | None, typer.Option("--insulation", help="Of a new batch.")] = None,
    seal: Annotated[str | None, typer.Option("--seal", help="Of a new batch.")] = None,
    backfill: Annotated[str | None, typer.Option("--backfill", help="Of a new batch: contact inside.")] = None,
    batch_note: Annotated[str | None, typer.Option("--batch-note", help="Of a new batch: a remark.")] = None,
    note: Annotated[str | None, typer.Option("--note", help="Of each probe: a remark.")] = None,
    json: Json = False,
) -> None:
    """Add probes: one, a range, or a numbered batch in one go.

    electrolog new --batch B9 --count 8 --length 100um --fibre "carbon fibre 7 um" --made-by wren
    """
    of_batch = {
        "batch": batch,
        "made_on": made_on,
        "made_by": made_by,
        "fibre": fibre,
        "fibre_diameter_um": fibre_diameter,
        "insulation": insulation,
        "seal": seal,
        "backfill": backfill,
        "note": batch_note,
    }
    of_probe = {"exposed_length_um": length, "diameter_um": diameter, "geometry": geometry, "note": note}
    made = lab_of(ctx, create=True).make_probes(
        labels or (),
        count=count,
        batch={name: text for name, text in of_batch.items() if text is not None},
        probe={name: text for name, text in of_probe.items() if text is not None},
    )
    if json:
        from electrolog.show.machine import print_json

        print_json({"electrodes": made, "batch": batch})
    else:
        from electrolog.show.text import one_line

        span = one_line(made[0]) if len(made) == 1 else f"{one_line(made[0])} to {one_line(made[-1])}"
        typer.echo(f"{len(made)} new: {span}" + (f", batch {one_line(batch)}" if batch else ""))
