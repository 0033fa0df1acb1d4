from __future__ import annotations

import typer

from electrolog.cli.options import Csv, Json
from electrolog.cli.session import lab_of


def command(ctx: typer.Context, json: Json = False, csv: Csv = False) -> None:
    """Make every calibration's figures again from its raw points, and list what changed.

    electrolog recompute
    """
    from electrolog.show import corrections
    from electrolog.show.progress import working

    with working("making every calibration's figures again"):
        changed = lab_of(ctx).recompute()
    corrections.answer_recomputed(changed, json, csv)
