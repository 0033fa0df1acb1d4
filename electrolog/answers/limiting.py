"""The lab's limits: what is set, what could be, and how a change is written."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass

from electrolog.answers.answer import Answer
from electrolog.errors import InputError
from electrolog.judge.rules import RULES, Rule, rule_named
from electrolog.record import amend, entry, queries, sheets
from electrolog.record.columns import Value
from electrolog.record.journal import Writer
from electrolog.record.readable import Row
from electrolog.record.store import Record
from electrolog.units import parse_quantity

LAB, COMMON = "lab decision", "common practice"


@dataclass(frozen=True)
class LimitSet(Answer):
    """A rule with the value the lab has set, if it has; the value is in the rule's unit."""

    rule: Rule
    value: float | None = None
    analyte: str | None = None
    project: str | None = None
    origin: str | None = None
    note: str | None = None


@dataclass(frozen=True)
class Scope:
    analyte: str | None = None
    project: str | None = None


def limits(record: Record) -> list[LimitSet]:
    """Every rule, set or not, in the order of the catalogue."""
    with record.reading() as connection:
        stored = queries.limits(connection)
    found = []
    for rule in RULES.values():
        own = [row for row in stored if row["rule"] == rule.name]
        found += [_as_set(rule, row) for row in own] or [LimitSet(rule)]
    return found


def set_limit(record: Record, name: str, text: str, scope: Scope, note: str | None) -> LimitSet:
    """Sets a limit, or changes the one that is set. Raises UnknownName, InputError."""
    rule = rule_named(name)
    value = rule.checked(parse_quantity(text, rule.unit, rule.name))
    with record.writing(f"limit set to {text}") as writer:
        return _written(writer, rule, value, scope, LAB, note)


def adopt(record: Record, names: Sequence[str]) -> list[LimitSet]:
    """Takes the common-practice values of the named rules, or of all that have one and aren't set yet."""
    rules = [rule_named(name) for name in names]
    for rule in rules:
        if rule.common_practice is None:
            raise InputError(f"{rule.name}: there is no common-practice value to adopt; {rule.why}")
    unset = {one.rule.name for one in limits(record) if one.value is None}
    rules = rules or [rule for rule in RULES.values() if rule.common_practice is not None and rule.name in unset]
    with record.writing("common practice adopted by the lab") as writer:
        return [
            _written(writer, rule, rule.common_practice, Scope(), COMMON, None)
            for rule in rules
            if rule.common_practice is not None
        ]


def typed_limits(texts: Mapping[str, str]) -> dict[str, float]:
    """Limits as typed, by rule, in the rule's unit."""
    rules = {name: rule_named(name) for name in texts}
    return {name: rule.checked(parse_quantity(texts[name], rule.unit, name)) for name, rule in rules.items()}


def unset(record: Record, name: str, scope: Scope, reason: str) -> None:
    """Strikes a limit; its journal keeps what it was."""
    rule = rule_named(name)
    with record.writing(reason or "limit unset") as writer:
        row = _stored(writer, rule, scope)
        if row is None:
            raise InputError(f"{rule.name} is not set for that scope; `electrolog limits` shows what is")
        amend.strike(writer, sheets.LIMITS, row["id"])


def _written(writer: Writer, rule: Rule, value: float, scope: Scope, origin: str, note: str | None) -> LimitSet:
    row = _stored(writer, rule, scope)
    if row is None:
        values: dict[str, Value] = {"rule": rule.name, "value": value, "origin": origin, "note": note}
        entry.add(writer, sheets.LIMITS, {**values, "analyte": scope.analyte, "project": scope.project})
    elif (row["value"], row["origin"], row["note"]) != (value, origin, note):
        amend.amend(writer, sheets.LIMITS, row["id"], {"value": value, "origin": origin, "note": note})
    return LimitSet(rule, value, scope.analyte, scope.project, origin, note)


def _stored(writer: Writer, rule: Rule, scope: Scope) -> Row | None:
    wanted_id = writer.names.row_id("analytes", scope.analyte) if scope.analyte else None
    for row in queries.limits(writer.connection):
        own_id = writer.names.row_id("analytes", row["analyte"]) if row["analyte"] else None
        if row["rule"] == rule.name and own_id == wanted_id and row["project"] == scope.project:
            return row
    return None


def _as_set(rule: Rule, row: Row) -> LimitSet:
    return LimitSet(rule, row["value"], row["analyte"], row["project"], row["origin"], row["note"])
