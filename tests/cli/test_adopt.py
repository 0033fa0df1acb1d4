"""A spreadsheet at the terminal: a dry run that says everything, questions only to a person, then the rows."""

from __future__ import annotations

import os
import sys
from pathlib import Path
from typing import Any

import pytest

BOOK = "Probe,Date,Stage,Sens. (nA/uM),[note]\nK-1,2024-03-04,pre,12.0,[x] ok\nK-1,2024-03-05,post,~8,\nK-2,,pre,9,\n"
ANSWERS = ("--answer", "analyte=DA", "--answer", "waveform=triangle")


@pytest.fixture
def book(tmp_path: Path) -> str:
    (tmp_path / "old.csv").write_text(BOOK, encoding="utf-8")
    return "old.csv"


def test_a_dry_run_says_what_was_understood_and_what_is_missing(empty: Any, book: str) -> None:
    before = empty.entries()
    out = empty.ok("adopt", book).out
    assert "sensitivity in nA/uM" in out
    assert "? What was measured?" in out
    assert "--answer waveform=…" in out
    assert "date: missing" in out
    assert "nothing was written" in out
    assert empty.entries() == before
    assert Path("old.adopt.toml").is_file()


def test_a_commit_with_an_open_question_is_refused_in_one_line(empty: Any, book: str) -> None:
    assert "analyte: What was measured?" in empty.refused("adopt", book, "--commit")
    assert "'waveform' is no answer" in empty.refused("adopt", book, "--answer", "waveform")


def test_what_was_adopted_answers_like_what_was_typed(empty: Any, book: str) -> None:
    told = empty.ok("adopt", book, *ANSWERS, "--commit", "--json").json
    assert [row["state"] for row in told["rows"]] == ["new", "new", "new"]
    assert {remark["place"] for remark in told["remarks"]} == {"old!A4:E4", "old!D3"}
    found = empty.ok("calibrations", "K-1", "--json").json
    assert [(one["stage"], one["sensitivity_na_um"]) for one in found] == [("pre", 12.0), ("post", 8.0)]
    assert "old!A2:E2" in empty.ok("journal", "--json").out
    assert "3 there already" in empty.ok("adopt", book, "--commit").out
    empty.ok("verify")


def test_a_person_is_asked_and_the_answers_are_kept(empty: Any, book: str, tmp_path: Path) -> None:
    pty = pytest.importorskip("pty", reason="a terminal of its own needs a POSIX system")
    answers = iter([b"DA\n", b"square\n", b"\n"])
    (tmp_path / "record.toml").write_text('waveform = "triangle"\n', encoding="utf-8")  # the lab's settings
    command = [sys.executable, "-m", "electrolog", "--db", empty.db, "adopt", book]
    said = b""

    def read(descriptor: int) -> bytes:
        nonlocal said
        piece = os.read(descriptor, 4096)
        said += piece
        if piece.rstrip().endswith((b"analyte:", b"waveform [triangle]:")):
            os.write(descriptor, next(answers))
        return piece

    status = pty.spawn(command, read, lambda _: b"")
    assert status == 0
    assert b"What was measured?" in said
    assert b"that is none of these" in said
    kept = Path("old.adopt.toml").read_text(encoding="utf-8")
    assert 'analyte = "DA"' in kept
    assert 'waveform = "triangle"' in kept


def test_a_long_book_is_told_in_few_lines(empty: Any, tmp_path: Path) -> None:
    rows = "".join(f"K-{place},2024-03-{place:02d},pre,~{place}.5\n" for place in range(1, 31))
    (tmp_path / "long.csv").write_text(f"Probe,Date,Stage,nA/uM\n{rows}", encoding="utf-8")
    out = empty.ok("adopt", "long.csv", *ANSWERS).out
    assert len(out.splitlines()) < 40
    assert "long!D2, long!D3, long!D4 and 27 more   '~1.5' is approximate (and 29 more values of the kind)" in out
    assert "and 25 more of probe, new; 25 more of calibration, new (--json lists them all)" in " ".join(out.split())
    assert len(empty.ok("adopt", "long.csv", "--json").json["remarks"]) == 30
