"""The journal and its verification."""

from __future__ import annotations

import json as json_text
from collections.abc import Sequence

from electrolog.clock import shown_moment
from electrolog.record.journal import Entry
from electrolog.record.verify import Verification
from electrolog.show.machine import plain, print_csv, print_json
from electrolog.show.tables import print_lines, print_table
from electrolog.units import counted


def answer(entries: Sequence[Entry], names: Sequence[str], json: bool, csv: bool) -> None:
    """`names`: what each entry did to what, as people call it."""
    if json or csv:
        rows = [{**plain(entry), "what": name} for entry, name in zip(entries, names, strict=True)]
        print_json(rows) if json else print_csv(rows)
    else:
        print_table(
            ("entry", "when", "who", "what", "change", "why"),
            [
                (
                    e.seq,
                    shown_moment(e.at),
                    e.who,
                    name,
                    change_shown(e),
                    e.reason,
                )
                for e, name in zip(entries, names, strict=True)
            ],
            numeric=("entry",),
        )


def change_shown(entry: Entry) -> str:
    """An amendment as before and after; of an addition the table itself tells more."""
    if entry.action != "amend":
        points = entry.change.get("points")
        return counted(len(points), "point") if points else ""
    before, after = entry.change["before"], entry.change["after"]
    return ", ".join(f"{name} {_plain(before[name])} to {_plain(after[name])}" for name in after)


def _plain(value: object) -> str:
    return "unknown" if value is None else json_text.dumps(value, ensure_ascii=False)


def answer_verification(found: Verification, json: bool) -> None:
    if json:
        print_json({"whole": found.whole, **vars(found)})
        return
    for fault in found.faults:
        print_lines(fault)
    said = "the record is what the journal says" if found.whole else counted(len(found.faults), "fault")
    print_lines(f"{said}; {counted(found.entries, 'entry', 'entries')}, head {found.head[:16]}")
    if found.since is not None:
        since = "1 entry was" if found.since == 1 else f"{found.since} entries were"
        print_lines(f"the head asked for is there; {since} written since")
