from __future__ import annotations

import typer

from electrolog.cli.options import Csv, Json


def command(ctx: typer.Context, json: Json = False, csv: Csv = False) -> None:
    """Say what every column of the record means: its unit, its bounds, what it accepts.

    electrolog dictionary --csv
    """
    from electrolog.answers.dictionary import entries
    from electrolog.show import dictionary

    dictionary.answer(entries(), json, csv)
