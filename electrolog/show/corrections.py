"""What a correction changed."""

from __future__ import annotations

from collections.abc import Sequence

from electrolog.answers.correcting import Corrected
from electrolog.answers.figures import Recomputed
from electrolog.show.entries import plain_name, shown
from electrolog.show.machine import plain, print_csv, print_json
from electrolog.show.tables import print_lines, print_table
from electrolog.units import shown_number


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


def answer_recomputed(changed: Sequence[Recomputed], json: bool, csv: bool) -> None:
    if json:
        print_json(changed)
    elif csv:
        print_csv([plain(one) for one in changed])
    elif not changed:
        print_lines("nothing changed: every kept figure is what its raw points give")
    else:
        columns = ("calibration", "was (nA/µM)", "is (nA/µM)", "method was", "method is")
        rows = [
            (
                one.calibration,
                shown_number(one.sensitivity_na_um_before, 4),
                shown_number(one.sensitivity_na_um, 4),
                one.method_before,
                one.method,
            )
            for one in changed
        ]
        print_table(columns, rows, numeric=columns[1:3])
