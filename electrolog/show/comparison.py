"""Groups of probes side by side."""

from __future__ import annotations

from collections.abc import Sequence

from electrolog.answers.comparing import Compared
from electrolog.judge.compare import Difference, Estimate
from electrolog.show.machine import plain, print_csv, print_json
from electrolog.show.tables import print_lines, print_table
from electrolog.units import shown_number

MOST_SHOWN = 18
_ESTIMATES = ("measure", "group", "probes", "value", "95 % interval")
_DIFFERENCES = ("measure", "between", "ratio or difference", "p (Holm)", "clear", "more per group")


def answer(found: Compared, json: bool, csv: bool) -> None:
    comparison = found.comparison
    if json:
        print_json(found)
    elif csv:
        print_csv([plain(one) for one in comparison.estimates])
    else:
        print_lines(f"{found.analyte} by {found.by}")
        print_table(
            _ESTIMATES, [_estimate(one) for one in comparison.estimates], ("probes", "value"), ("probes",), "measure"
        )
        print_lines("")
        shown, rest = _clearest(comparison.differences)
        rows = [_difference(one) for one in shown]
        print_table(_DIFFERENCES, rows, ("p (Holm)",), ("more per group", "clear", "p (Holm)"), "measure")
        print_lines(*rest, *_said(found), *[f"! {note}" for note in found.notes])


def _clearest(differences: Sequence[Difference]) -> tuple[list[Difference], list[str]]:
    """Eight batches make 28 pairs in every measure: the clearest, and how many more there are."""
    if len(differences) <= MOST_SHOWN:
        return list(differences), []
    shown = sorted(differences, key=lambda one: 2.0 if one.p is None else one.p)[:MOST_SHOWN]
    return shown, [f"and {len(differences) - MOST_SHOWN} less clear ones; --json shows all"]


def _estimate(one: Estimate) -> tuple[object, ...]:
    interval = "not known" if one.low is None and one.high is None else f"{_shown(one.low)} to {_shown(one.high)}"
    measure = "hours until retired (median)" if one.measure == "survival" else one.measure
    value = "not reached" if one.value is None and one.measure == "survival" else _shown(one.value)
    return measure, one.group, one.count, value, interval


def _difference(one: Difference) -> tuple[object, ...]:
    value = "not known"
    if one.value is not None:
        sign = "× " if one.as_ratio else ""
        value = f"{sign}{_shown(one.value)} [{_shown(one.low)} to {_shown(one.high)}]"
    p = "" if one.p_holm is None else shown_number(one.p_holm, 2)
    more = "" if one.more_probes is None else str(one.more_probes)
    measure = "rate of retirement" if one.measure == "survival" else one.measure
    return measure, f"{one.first} to {one.second}", value, p, "yes" if one.clear else "no", more


def _shown(value: float | None) -> str:
    return "?" if value is None else shown_number(value)


def _said(found: Compared) -> list[str]:
    said = [found.comparison.said, "more per group: probes until a difference like the one seen would be clear (80 %)"]
    if found.next is not None:
        dealt = ", ".join(f"{count} {name}" for name, count in found.next.more.items() if count)
        said.append(f"where the next probes teach most: {dealt or 'none asked for'}")
    return said
