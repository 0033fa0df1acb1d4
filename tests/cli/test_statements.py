"""How often a question asks the database: the same number of times for one probe as for many, and never everything."""

from __future__ import annotations

from collections.abc import Callable, Iterator, Sequence
from contextlib import contextmanager
from typing import Any

import pytest
from sqlalchemy import event

from electrolog.answers.asked import Run
from electrolog.answers.shelf import Filter
from electrolog.lab import Lab, open_lab
from tests.cli.conftest import Terminal

RUN = Run("dopamine", "triangle", "in-vivo", 120.0)
FEW, MANY = ("G0-0",), ("G0-0", "G1-1", "G2-2", "G3-3", "G4-0", "G5-1", "G6-2", "G7-3")
Question = Callable[[Lab, Sequence[str]], object]
Statement = tuple[str, Any]
MOST: dict[str, tuple[Question, int]] = {
    "readings": (lambda lab, labels: lab.readings(labels), 30),
    "check": (lambda lab, labels: lab.check(labels, RUN), 30),
    "forecast": (lambda lab, labels: lab.forecast(labels, RUN), 30),
    "life": (lambda lab, labels: lab.life(labels[0]), 15),
}
# What a lab has tens of, however long it keeps a record.
SMALL = {"analytes", "waveforms", "terms", "limits", "standards", "batches", "kept_fits", "alembic_version"}


@contextmanager
def heard(lab: Lab) -> Iterator[list[Statement]]:
    found: list[Statement] = []

    def hear(_connection: Any, _cursor: Any, statement: str, values: Any, *_: Any) -> None:
        found.append((statement, values))

    event.listen(lab.record.engine, "before_cursor_execute", hear)
    yield found
    event.remove(lab.record.engine, "before_cursor_execute", hear)


@pytest.mark.parametrize("name", MOST)
def test_a_question_asks_as_often_for_many_probes_as_for_one(name: str, judged: Terminal) -> None:
    lab = open_lab(judged.db)
    question, most = MOST[name]
    question(lab, FEW)  # figures that were never made are made and kept
    with heard(lab) as once:
        question(lab, FEW)
    with heard(lab) as often:
        question(lab, MANY)
    assert 0 < len(once) <= most
    assert len(often) == len(once)


def test_the_shelf_is_asked_for_at_once(judged: Terminal) -> None:
    lab = open_lab(judged.db)
    lab.shelf(Filter())
    with heard(lab) as said:
        assert len(lab.shelf(Filter())) > len(MANY)
    assert 0 < len(said) <= 30


def test_many_labels_are_looked_up_at_once(judged: Terminal) -> None:
    lab = open_lab(judged.db)
    every = [str(row["electrode"]) for row in lab.rows("electrodes")]
    with heard(lab) as said:
        assert lab.labels(every) == every
    assert 0 < len(said) <= 3


@pytest.mark.parametrize("name", MOST)
def test_what_is_asked_of_one_probe_is_found_by_an_index(name: str, judged: Terminal) -> None:
    """SQLite's own account of how it looks (EXPLAIN QUERY PLAN): a large table is searched, never scanned."""
    lab = open_lab(judged.db)
    question, _ = MOST[name]
    question(lab, FEW)
    with heard(lab) as said:
        question(lab, FEW)
    selects = [(statement, values) for statement, values in said if statement.lstrip().upper().startswith("SELECT")]
    assert selects
    assert [scan for statement in selects for scan in scans(lab, *statement)] == []


def scans(lab: Lab, statement: str, values: Any) -> list[str]:
    with lab.record.reading() as connection:
        plan = connection.exec_driver_sql(f"EXPLAIN QUERY PLAN {statement}", tuple(values or ()))
        steps = [str(step.detail).split() for step in plan]
    return [" ".join(step) for step in steps if step[0] == "SCAN" and step[1] not in {*SMALL, "CONSTANT"}]


def test_a_scan_is_seen_for_what_it_is(judged: Terminal) -> None:
    lab = open_lab(judged.db)
    assert scans(lab, "SELECT * FROM calibrations WHERE noise_na > ?", (1.0,)) == ["SCAN calibrations"]
    assert scans(lab, "SELECT * FROM calibrations WHERE id = ?", (1,)) == []
