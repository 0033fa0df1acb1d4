"""The names in a file's columns turned into row numbers, its words into the lists' own spelling."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

from electrolog.errors import shortened
from electrolog.record import columns as kinds
from electrolog.record.exchange_cells import Memo, Refusal, refusals
from electrolog.record.exchange_faults import Faults
from electrolog.record.exchange_files import Rows
from electrolog.record.names import Names
from electrolog.record.sheets import BY_NAME


def resolve(rows: Rows, names: Names, unsure: set[str], faults: Faults) -> None:
    """Replaces names and words in place; a row with one that isn't known becomes faulty.

    `unsure` names the sheets whose files couldn't be read whole: a name that such a file may have isn't refused.
    """
    for place, column in enumerate(rows.sheet.columns):
        if isinstance(column, kinds.Link):
            silent = column.to in unsure
            _replace(rows, place, _linked(column, names, faults), faults, silent)
        elif isinstance(column, kinds.Word):
            _replace(rows, place, _worded(column, names, faults), faults, "terms" in unsure)


def _replace(rows: Rows, place: int, found: Callable[[str], object], faults: Faults, silent: bool) -> None:
    memo = Memo(found)
    values: list[Any] = [None if text is None else memo[text] for text in rows.cells[place]]
    for index, why in list(refusals(values)):
        values[index] = None
        rows.faulty.add(index)
        if not silent:
            faults.add(rows.file, rows.lines[index], f"{rows.sheet.columns[place].name}: {why}")
    rows.cells[place] = values


def _linked(column: kinds.Link, names: Names, faults: Faults) -> Callable[[str], object]:
    def found(text: str) -> object:
        row_id = names.find(column.to, text)
        if row_id is not None:
            return row_id
        known = [spelling for spelling, _ in names.everything(column.to).values()]
        hint = f"; accepted: one in {column.to}.csv or in the record"
        return Refusal(faults.unknown(BY_NAME[column.to].one, text, known, hint))

    return found


def _worded(column: kinds.Word, names: Names, faults: Faults) -> Callable[[str], object]:
    def found(text: str) -> object:
        word = names.find_word(column.kind, text)
        hint = f"; add it as a row of terms.csv: {column.kind},{shortened(text, 40)}"
        return word or Refusal(faults.unknown(column.kind, text, names.words(column.kind), hint))

    return found
