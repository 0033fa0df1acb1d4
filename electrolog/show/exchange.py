"""What an import took in and an export wrote."""

from __future__ import annotations

from typing import TYPE_CHECKING

from electrolog.show.machine import print_json
from electrolog.show.tables import print_lines, print_table

if TYPE_CHECKING:
    from electrolog.record.exchange_in import ImportReport
    from electrolog.record.exchange_out import ExportReport


def answer_import(report: ImportReport, json: bool) -> None:
    if json:
        print_json(report)
        return
    columns = ("file", "added", "there already", "filled in")
    rows = [(f"{one.sheet}.csv", one.added, one.already_there, one.filled_in) for one in report.sheets]
    print_table(columns, rows, numeric=columns[1:])
    print_lines(*report.notes)
    if not any(one.added or one.filled_in for one in report.sheets):
        print_lines("nothing new: the record holds all of this already")


def answer_export(report: ExportReport, json: bool) -> None:
    if json:
        print_json(report)
        return
    print_table(
        ("file", "rows"), [(f"{sheet}.{report.kind}", count) for sheet, count in report.rows.items()], numeric=("rows",)
    )
