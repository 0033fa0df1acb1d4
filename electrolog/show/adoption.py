"""What was understood of a spreadsheet, what is asked, what would be or was written, cell by cell."""

from __future__ import annotations

import re
from collections import Counter
from collections.abc import Mapping
from typing import TYPE_CHECKING, Any

from electrolog.clock import shown_moment
from electrolog.record import sheets
from electrolog.show.machine import print_json
from electrolog.show.tables import named, print_lines, print_table
from electrolog.units import counted, shown_duration, shown_number

MOST_ROWS = 5  # of a kind
MOST_PLACES = 3  # that say the same
_OWN = re.compile(r"'[^']*'|\b\d{4}\b|[^\s;]+![A-Z]+\d+(:[A-Z]+\d+)?")  # a cell's own value, a year, a place

if TYPE_CHECKING:
    from electrolog.record.books.adoption import AdoptedRow, Adoption


def answer(found: Adoption, json: bool) -> None:
    if json:
        print_json(found)
        return
    headings = [(one.heading, one.place, one.meaning, one.why) for one in found.headings]
    print_table(
        ("heading", "first at", "read as", "because of"),
        headings,
        least=("because of", "first at"),
        other_ways=" or --json",
    )
    print_lines("")
    _print_rows(found)
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


def _print_rows(found: Adoption) -> None:
    """The first of each kind and state: nobody reads a thousand lines at a terminal."""
    shown: list[tuple[str, ...]] = []
    more: Counter[str] = Counter()
    seen: Counter[tuple[str, str]] = Counter()
    for row in found.rows:
        kind = sheets.BY_NAME[row.sheet].one
        seen[kind, row.state] += 1
        if seen[kind, row.state] <= MOST_ROWS:
            shown.append((row.state, row.place, kind, row.name, _shown(row)))
        else:
            more[f"{kind}, {row.state}"] += 1
    print_table(
        ("state", "where", "what", "name", "holds"), shown, least=("name",), wrapped="holds", other_ways=" or --json"
    )
    if more:
        said = "; ".join(f"{count} more of {what}" for what, count in more.items())
        print_lines(f"and {said} (--json lists them all)")


def _print_remarks(found: Adoption) -> None:
    """Remarks that differ in a value only stand together: the first of them, and where the others are."""
    for kind in ("refused", "doubtful", "left out"):
        alike: dict[str, list[tuple[str, str]]] = {}
        for one in found.remarks:
            if one.kind == kind:
                alike.setdefault(_OWN.sub("…", one.said), []).append((one.place, one.said))
        if alike:
            print_lines("")
            print_table((f"{kind}: where", "why"), [_remark(told) for told in alike.values()], wrapped="why")


def _remark(told: list[tuple[str, str]]) -> tuple[str, str]:
    others = len({said for _, said in told}) - 1
    more = f" (and {counted(others, 'more value')} of the kind)" if others else ""
    return named([place for place, _ in told], MOST_PLACES), told[0][1] + more


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
