"""What was understood of a spreadsheet, what is asked, what would be or was written, cell by cell."""

from __future__ import annotations

from collections.abc import Mapping
from typing import TYPE_CHECKING, Any

from electrolog.clock import shown_moment
from electrolog.record import sheets
from electrolog.show.machine import print_json
from electrolog.show.tables import print_lines, print_table
from electrolog.units import shown_duration, shown_number

if TYPE_CHECKING:
    from electrolog.record.books.adoption import AdoptedRow, Adoption


def answer(found: Adoption, json: bool) -> None:
    if json:
        print_json(found)
        return
    headings = [(one.heading, one.place, one.meaning, one.why) for one in found.headings]
    print_table(("heading", "first at", "read as", "because of"), headings, least=("because of", "first at"))
    print_lines("")
    rows = [(row.state, row.place, sheets.BY_NAME[row.sheet].one, row.name, _shown(row)) for row in found.rows]
    print_table(("state", "where", "what", "name", "holds"), rows, least=("name",), wrapped="holds")
    _print_remarks(found)
    print_lines("", *_summary(found))


def _shown(row: AdoptedRow) -> str:
    values: Mapping[str, Any] = row.values
    if row.sheet == "calibrations":
        points = " ".join(f"{shown_number(c)}:{shown_number(i, 4)}" for c, i in row.points)
        factor = points or f"{shown_number(values.get('sensitivity_na_um'), 4)} nA/µM"
        return f"{shown_moment(values['at'])}, {factor}"
    if row.sheet == "exposures":
        return (
            f"{shown_moment(values['start'])}, {shown_duration(values['duration_min'])}, {values.get('setting', '?')}"
        )
    if row.sheet == "coatings":
        return f"{shown_moment(values['at'])}, {values['material']}"
    return ", ".join(f"{name} {value}" for name, value in values.items() if name not in ("electrode", "batch"))


def _print_remarks(found: Adoption) -> None:
    for kind in ("refused", "doubtful", "left out"):
        said = [(one.place, one.said) for one in found.remarks if one.kind == kind]
        if said:
            print_lines("")
            print_table((f"{kind}: where", "why"), said, wrapped="why")


def _summary(found: Adoption) -> list[str]:
    states = dict.fromkeys(row.state for row in found.rows)
    counts = ", ".join(f"{found.count(state)} {state}" for state in states) or "no rows"
    refused = sum(one.kind == "refused" for one in found.remarks)
    lines = [f"{found.book}: {counts}; {refused} refused; the mapping is in {found.mapping_file}", *found.notes]
    for one in found.questions:
        lines.append(f"? {one.text} ({one.why}) -- --answer {one.key}=…  accepted: {', '.join(one.accepted)}")
    if not found.committed:
        lines.append("a dry run: nothing was written; --commit writes what is new, all of it or nothing")
    return lines
