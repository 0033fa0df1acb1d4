"""The lab's limits as a table."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

from electrolog import units
from electrolog.answers.limiting import LimitSet
from electrolog.judge.limits import LimitRow, contradictions, effective
from electrolog.judge.rules import Rule
from electrolog.show.machine import print_csv, print_json
from electrolog.show.tables import print_lines, print_table


def answer(limits: Sequence[LimitSet], json: bool, csv: bool) -> None:
    rows = [as_dict(limit) for limit in limits]
    if json:
        print_json(rows)
    elif csv:
        print_csv(rows)
    else:
        columns = ("limit", "value", "for", "origin", "common practice", "meaning")
        print_table(
            columns,
            [_row(limit) for limit in limits],
            least=("meaning", "common practice", "for", "origin"),
            wrapped="meaning",
        )


def answer_all(limits: Sequence[LimitSet], json: bool, csv: bool) -> None:
    """Every limit; and, for a person, which of those for everyone can't hold together."""
    answer(limits, json, csv)
    if not (json or csv):
        print_lines(*[f"! {text}" for text in at_odds(limits)])


def at_odds(limits: Sequence[LimitSet]) -> tuple[str, ...]:
    for_everyone = [one for one in limits if not one.analyte and not one.project]
    rows = [LimitRow(one.rule.name, one.value, one.origin or "") for one in for_everyone if one.value is not None]
    return contradictions(effective(rows))


def as_dict(limit: LimitSet) -> dict[str, Any]:
    return {
        "rule": limit.rule.name,
        "value": limit.value,
        "unit": limit.rule.unit.sign,
        "analyte": limit.analyte,
        "project": limit.project,
        "origin": limit.origin,
        "note": limit.note,
        "common_practice": limit.rule.common_practice,
        "meaning": limit.rule.meaning,
    }


def _row(limit: LimitSet) -> tuple[str, ...]:
    rule = limit.rule
    value = "not set" if limit.value is None else f"{rule.direction} {shown(rule, limit.value)}"
    scope = ", ".join(part for part in (limit.analyte, limit.project and f"project {limit.project}") if part)
    offered = "none" if rule.common_practice is None else shown(rule, rule.common_practice)
    return (rule.name, value, scope or "everyone", limit.origin or "", offered, rule.meaning)


def shown(rule: Rule, value: float) -> str:
    if rule.unit is units.FRACTION:
        return f"{units.shown_number(value * 100)} %"
    if rule.unit is units.CONCENTRATION_UM:
        return units.shown_concentration(value)
    return f"{units.shown_number(value)} {rule.unit.sign}".rstrip()
