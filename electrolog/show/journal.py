"""The journal and its verification."""

from __future__ import annotations

import json as json_text
from collections.abc import Sequence

from electrolog.clock import shown_moment
from electrolog.record.journal import Entry
from electrolog.record.sheets import BY_NAME
from electrolog.record.verify import Verification
from electrolog.show.machine import plain, print_csv, print_json
from electrolog.show.tables import print_lines, print_table


def answer(entries: Sequence[Entry], json: bool, csv: bool) -> None:
    if json:
        print_json(entries)
    elif csv:
        print_csv([plain(entry) for entry in entries])
    else:
        print_table(
            ("entry", "when", "who", "what", "change", "why"),
            [
                (
                    e.seq,
                    shown_moment(e.at),
                    e.who,
                    f"{e.action} {BY_NAME[e.sheet].one} {e.row_id}",
                    change_shown(e),
                    e.reason,
                )
                for e in entries
            ],
            numeric=("entry",),
        )


def change_shown(entry: Entry) -> str:
    """An amendment as before and after; of an addition the table itself tells more."""
    if entry.action != "amend":
        points = entry.change.get("points")
        return f"{len(points)} points" if points else ""
    before, after = entry.change["before"], entry.change["after"]
    place = f"point {entry.change['ordinal']}: " if "ordinal" in entry.change else ""
    return place + ", ".join(f"{name} {_plain(before[name])} to {_plain(after[name])}" for name in after)


def _plain(value: object) -> str:
    return "unknown" if value is None else json_text.dumps(value, ensure_ascii=False)


def answer_verification(found: Verification, json: bool) -> None:
    if json:
        print_json({"whole": found.whole, **vars(found)})
        return
    for fault in found.faults:
        print_lines(fault)
    said = "the record is what the journal says" if found.whole else f"{len(found.faults)} faults"
    print_lines(f"{said}; {found.entries} entries, head {found.head[:16]}")
    if found.since is not None:
        print_lines(f"the head asked for is there; {found.since} entries were written since")
