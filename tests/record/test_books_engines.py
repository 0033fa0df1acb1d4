"""A book comes in alike on SQLite and PostgreSQL, and a dry run leaves nothing behind on either."""

from __future__ import annotations

from pathlib import Path

from electrolog.lab import Lab
from tests.record.messy_books import BOOKS


def test_a_book_comes_in_alike_on_every_engine(lab: Lab, tmp_path: Path) -> None:
    messy = next(book for book in BOOKS if book.name == "beside.xlsx")
    path = tmp_path / messy.name
    messy.make(path)
    before = lab.verify()
    assert lab.adopt(path, answers=messy.answers).count("new") == 7
    assert lab.verify() == before
    lab.adopt(path, commit=True)
    factors = {(row["electrode"], row["stage"]): row["sensitivity_na_um"] for row in lab.rows("calibrations")}
    assert factors == {("E1", "pre"): 10.0, ("E1", "post"): 6.0, ("E2", "pre"): 11.0}
    assert lab.adopt(path, commit=True).count("there already") == 7
    assert lab.verify().faults == ()
