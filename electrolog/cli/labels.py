from __future__ import annotations

from pathlib import Path
from typing import Annotated

import typer

from electrolog.cli.options import Json, Labels
from electrolog.cli.session import lab_of


def command(
    ctx: typer.Context,
    labels: Labels,
    out: Annotated[Path, typer.Option("--out", "-o", metavar="FILE", help="A .pdf, .svg or .png.")],
    paper: Annotated[str, typer.Option("--paper", help="a4 or letter")] = "a4",
    size: Annotated[str, typer.Option("--size", help="Of one code, its white border included.")] = "18mm",
    json: Json = False,
) -> None:
    """A sheet of stickers for storage boxes; a label read by a hand scanner is taken wherever a probe is named.

    electrolog labels B07-01..B07-03 --out stickers.pdf
    """
    from electrolog.show.machine import print_json
    from electrolog.show.stickers import Sheet, write_stickers
    from electrolog.show.tables import print_lines
    from electrolog.units import LENGTH_UM, parse_quantity

    names = lab_of(ctx).labels(labels)
    pages = write_stickers(out, names, Sheet(paper.casefold(), parse_quantity(size, LENGTH_UM, "size") / 1000))
    if json:
        print_json({"file": str(out), "stickers": len(names), "pages": pages})
    else:
        print_lines(f"wrote {out}: {len(names)} stickers on {pages} page{'' if pages == 1 else 's'}")
