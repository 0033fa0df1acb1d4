"""What the logging commands have in common: write, then say what was understood."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import TYPE_CHECKING

import typer

from electrolog.cli.session import lab_of, once_confirmed

if TYPE_CHECKING:
    from electrolog.answers.entering import Entered


def log_and_answer(
    ctx: typer.Context, sheet: str, labels: Sequence[str], values: Mapping[str, str | None], yes: bool, json: bool
) -> None:
    """Logs one event per probe and answers with what is now in the record."""
    lab = lab_of(ctx)
    known = {name: text for name, text in values.items() if text is not None}
    entered = once_confirmed(lambda confirmed: lab.log(sheet, labels, known, confirmed=confirmed), yes)
    say(entered, json)


def say(entered: Sequence[Entered], json: bool) -> None:
    from electrolog.show import entries

    if json:
        from electrolog.show.machine import print_json

        print_json([entries.as_dict(one) for one in entered])
    else:
        for line in entries.sentences(entered):
            typer.echo(line)
