"""The data dictionary said back: what every column of the record means."""

from __future__ import annotations

from collections.abc import Mapping, Sequence

from electrolog.show.machine import print_csv, print_json
from electrolog.show.tables import print_table


def answer(rows: Sequence[Mapping[str, str]], json: bool, csv: bool) -> None:
    if json:
        print_json(rows)
    elif csv:
        print_csv(rows)
    else:
        print_table(list(rows[0]), [list(row.values()) for row in rows], wrapped="meaning", least=("accepts",))
