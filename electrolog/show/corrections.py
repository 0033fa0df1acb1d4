"""What a correction changed."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import fields
from typing import Any

from electrolog.answers.correcting import Corrected
from electrolog.answers.figures import Recomputed
from electrolog.show.entries import plain_name, shown
from electrolog.show.machine import plain, print_csv, print_json
from electrolog.show.tables import print_lines, with_error
from electrolog.units import counted, shown_number


def answer(corrected: Corrected, json: bool) -> None:
    if json:
        print_json(corrected)
        return
    if not corrected.changes:
        print_lines(f"{corrected.what}: struck; it stays in the record and out of every answer")
    for column, (before, after) in corrected.changes.items():
        name = plain_name(column)
        old, new = (shown(corrected.sheet, column, value) for value in (before, after))
        print_lines(f"{corrected.what}: {name} was {old}, is {new}")
    for label, (before, after) in corrected.sensitivities.items():
        print_lines(f"  {label}: sensitivity was {with_error(*before)}, is {with_error(*after)} nA/µM")


def answer_recomputed(changed: Sequence[Recomputed], json: bool, csv: bool) -> None:
    if json:
        print_json(changed)
    elif csv:
        print_csv([plain(one) for one in changed], [column.name for column in fields(Recomputed)])
    elif not changed:
        print_lines("nothing changed: every kept figure is what its raw points give")
    else:
        for one in changed:
            made_by = f" (method {one.method_before}, now {one.method})" if one.method_before != one.method else ""
            told = [_change(name, pair) for name, pair in one.changes.items() if name != "method"]
            print_lines(f"{one.calibration}{made_by}: {'; '.join(told) or 'the same figures'}")
        print_lines(f"{counted(len(changed), 'calibration')} changed")


def _change(name: str, pair: tuple[Any, Any]) -> str:
    if name == "warnings":
        gone, new = ([text for text in one if text not in other] for one, other in (pair, pair[::-1]))
        return ", ".join([*[f"no longer said: {text}" for text in gone], *[f"now said: {text}" for text in new]])
    before, after = (shown_number(value, 6) if isinstance(value, float) else value for value in pair)
    return f"{name} {before} -> {after}"
