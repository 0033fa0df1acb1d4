"""What is asked of one probe, or to fit one cohort, is found by indexes: no statement reads a growing table whole."""

from __future__ import annotations

import re
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from datetime import datetime
from typing import Any

import pytest
from sqlalchemy import Connection, Engine, event

from electrolog.answers.asked import Run
from electrolog.lab import Lab
from electrolog.record.schema import metadata

FEW = {"terms", "analytes", "waveforms", "limits"}  # a lab's words and demands: dozens, however long it goes on
GROWING = set(metadata.tables) - FEW
RUN = Run("dopamine", "triangle", "in-vivo", 120.0)
MOMENT = datetime.fromisoformat("2026-01-10T12:00+00:00")
QUESTIONS: dict[str, Callable[[Lab], object]] = {
    "labels": lambda lab: lab.labels(["B1-01", "b1-02"]),
    "life": lambda lab: lab.life("B1-01"),
    "history": lambda lab: lab.readings(["B1-01"]),
    "course": lambda lab: lab.courses(["B1-01"], moment=MOMENT),
    "check": lambda lab: lab.check(["B1-01"], RUN, moment=MOMENT),
    "fit": lambda lab: lab.cohort_fit("dopamine"),
}
Statements = list[tuple[str, Any]]


@contextmanager
def listening() -> Iterator[Statements]:
    heard: Statements = []

    def hear(_connection: Connection, _cursor: object, statement: str, values: Any, *_: object) -> None:
        if statement.startswith("SELECT"):
            heard.append((statement, values))

    event.listen(Engine, "before_cursor_execute", hear)
    try:
        yield heard
    finally:
        event.remove(Engine, "before_cursor_execute", hear)


def read_whole(lab: Lab, heard: Statements) -> list[str]:
    """Every growing table that a statement would go through from end to end, with the statement."""
    with lab.record.engine.connect() as connection:
        found = of_file if lab.record.is_file else of_server
        return [
            f"{table}: {statement}" for statement, values in heard for table in found(connection, statement, values)
        ]


def of_file(connection: Connection, statement: str, values: Any) -> list[str]:
    """SQLite says SCAN where it goes through all, with an index or without, and SEARCH where an index leads it."""
    steps = [row[3] for row in connection.exec_driver_sql(f"EXPLAIN QUERY PLAN {statement}", values)]
    names = [match[1] for step in steps if (match := re.match(r"SCAN (\w+)", step))]
    return [name for name in map(unaliased, names) if name in GROWING]


def unaliased(name: str) -> str:
    singular = name.removeprefix("named_")
    return next((table for table in GROWING if singular in (table.removesuffix("s"), table.removesuffix("es"))), name)


def of_server(connection: Connection, statement: str, values: Any) -> list[str]:
    """PostgreSQL goes through a small table whole, whatever its indexes; so it is told that they are large."""
    tables = ", ".join(f"'{name}'" for name in GROWING)
    connection.exec_driver_sql(f"UPDATE pg_class SET reltuples = 1e6, relpages = 1 WHERE relname IN ({tables})")
    for way in ("seqscan", "hashjoin", "mergejoin"):
        connection.exec_driver_sql(f"SET enable_{way} = off")
    (plan,) = connection.exec_driver_sql(f"EXPLAIN (FORMAT JSON) {statement}", values).scalar_one()
    return [
        node["Relation Name"]
        for node in nodes(plan["Plan"])
        if node.get("Relation Name") in GROWING and not {"Index Cond", "Recheck Cond"} & set(node)
    ]


def nodes(node: dict[str, Any]) -> Iterator[dict[str, Any]]:
    """But for the first or newest entry of an index, which the plan calls a scan cut off by a limit."""
    yield node
    for below in node.get("Plans", ()):
        if not (node["Node Type"] == "Limit" and "Index" in below["Node Type"]):
            yield from nodes(below)


def test_no_growing_table_is_read_whole_for_one_probe_or_one_cohort(lived_in: Lab) -> None:
    lived_in.cohort_fit("dopamine")
    for name, ask in QUESTIONS.items():
        with listening() as heard:
            ask(lived_in)
        assert len(heard) > 1, name
        assert read_whole(lived_in, heard) == [], name


@pytest.mark.parametrize(
    "statement",
    [
        "SELECT id FROM calibrations WHERE rig = 'north'",
        "SELECT count(*) FROM journal WHERE who = 'wren'",
        "SELECT count(*) FROM electrodes",
        "SELECT 1 FROM standards JOIN batches ON standards.note = batches.note WHERE standards.id = 1",
    ],
)
def test_reading_a_table_whole_is_seen(lived_in: Lab, statement: str) -> None:
    assert len(read_whole(lived_in, [(statement, ())])) == 1
