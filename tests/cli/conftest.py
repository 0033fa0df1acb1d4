"""The terminal as a person or a script meets it: most commands in this process, some as real subprocesses."""

from __future__ import annotations

import io
import json
import os
import shutil
import subprocess
import sys
from collections.abc import Callable
from dataclasses import dataclass
from datetime import timedelta
from pathlib import Path
from typing import Any

import pytest

from electrolog.cli.main import main
from electrolog.lab import open_lab, set_up
from tests.cli.fouled_lab import BETWEEN_DAYS, DAYS, FIRST, fouled_lab

JUDGED_AT = (FIRST + DAYS * BETWEEN_DAYS + timedelta(hours=9)).isoformat()
POINTS = ("0:0.1", "0.25uM:3.2", "0.5uM:6.1,6.3", "1uM:12.2", "2uM:24.0")


@dataclass(frozen=True)
class Answer:
    status: int
    out: str
    err: str

    @property
    def json(self) -> Any:
        return json.loads(self.out)


class Stream(io.TextIOWrapper):
    """A standard stream into memory, in UTF-8 as a present-day terminal has it."""

    def __init__(self) -> None:
        super().__init__(io.BytesIO(), encoding="utf-8", errors="strict", newline="", write_through=True)

    def text(self) -> str:
        self.flush()
        return self.buffer.getvalue().decode()  # type: ignore[attr-defined]


@dataclass
class Terminal:
    """`electrolog --db DB …`: call it with the arguments."""

    db: str
    monkeypatch: pytest.MonkeyPatch

    def __call__(self, *arguments: str) -> Answer:
        out, err = Stream(), Stream()
        with self.monkeypatch.context() as patch:
            patch.setattr(sys, "stdout", out)
            patch.setattr(sys, "stderr", err)
            patch.setattr(sys, "stdin", io.StringIO(""))
            status = main(["--db", self.db, *arguments])
        return Answer(status, out.text(), err.text())

    def ok(self, *arguments: str) -> Answer:
        """For what must succeed before the test can begin, or is itself the test."""
        answer = self(*arguments)
        assert (answer.status, answer.err) == (0, "")
        return answer

    def refused(self, *arguments: str, status: int = 2) -> str:
        """The one line on standard error; nothing on standard output, nothing written."""
        before = self.entries()
        answer = self(*arguments)
        assert (answer.status, answer.out) == (status, "")
        assert answer.err.startswith("electrolog: ")
        assert answer.err.endswith("\n")
        assert answer.err.count("\n") == 1, answer.err
        assert "Traceback" not in answer.err
        assert "an error in electrolog itself" not in answer.err
        assert self.entries() == before
        return answer.err

    def entries(self) -> int:
        if not Path(self.db).is_file():
            return 0
        return open_lab(self.db).verify().entries

    def process(self, *arguments: str, **environment: str) -> subprocess.CompletedProcess[bytes]:
        """The same as a process of its own."""
        return subprocess.run(
            [sys.executable, "-m", "electrolog", "--db", self.db, *arguments],
            capture_output=True,
            check=False,
            stdin=subprocess.DEVNULL,
            env=os.environ | environment,
            timeout=120,
        )


@pytest.fixture(scope="session")
def empty_record(tmp_path_factory: pytest.TempPathFactory) -> Path:
    path = tmp_path_factory.mktemp("cli") / "empty.db"
    set_up(str(path))
    return path


@pytest.fixture(scope="session")
def filled_record(empty_record: Path, tmp_path_factory: pytest.TempPathFactory) -> Path:
    """Batch B9 as new as the bench guide needs it, batch B07 with a past."""
    path = Path(shutil.copy(empty_record, tmp_path_factory.mktemp("cli") / "filled.db"))
    with pytest.MonkeyPatch.context() as patch:
        cli = Terminal(str(path), patch)
        fill(cli)
    return path


def fill(cli: Terminal) -> None:
    cli.ok("new", "--batch", "B9", "--count", "8", "--made-on", "2026-01-05", "--made-by", "wren")
    cli.ok("new", "--batch", "B07", "--count", "3", "--made-on", "2026-01-05", "--made-by", "finch")
    cli.ok("standard", "S-48-DA", "dopamine", "10mM", "--uncertainty", "2%", "--prepared", "2026-01-07T08:00Z")
    cli.ok("coat", "B07-01", "-m", "PFSA", "--at", "2026-01-06T12:00Z")
    for number, probe in enumerate(("B07-01", "B07-02", "B07-03")):
        at = ("-w", "triangle", "--at", f"2026-01-07T{9 + number:02d}:00Z", "--label", f"C00{42 + number}")
        cli.ok("calibrate", probe, "pre", "DA", *POINTS, *at)
    for day in range(8, 20):
        run = ("--for", "2h", "-s", "in-vivo", "-w", "triangle", "--start", f"2026-01-{day:02d}T09:00Z")
        cli.ok("expose", "B07-01", *run)
    weaker = ("0:0.1", "0.5uM:4.1,4.3", "1uM:8.2", "2uM:16.1")
    cli.ok("calibrate", "B07-01", "post", "DA", *weaker, "--at", "2026-01-20T09:00Z", "--label", "C0050")
    cli.ok("clean", "B07-01", "-m", "isopropanol", "--at", "2026-01-20T10:00Z")
    cli.ok("retire", "B07-02", "-r", "broken", "--at", "2026-01-21T10:00Z")


@pytest.fixture
def cli(filled_record: Path, tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Terminal:
    """With the filled record, a copy for this test alone; in a folder of its own."""
    monkeypatch.chdir(tmp_path)
    return Terminal(str(shutil.copy(filled_record, tmp_path / "record.db")), monkeypatch)


@pytest.fixture
def empty(empty_record: Path, tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Terminal:
    """With a record just made."""
    monkeypatch.chdir(tmp_path)
    return Terminal(str(shutil.copy(empty_record, tmp_path / "record.db")), monkeypatch)


@pytest.fixture(scope="session")
def judged_record(empty_record: Path, tmp_path_factory: pytest.TempPathFactory) -> Path:
    """A lab whose fouling is known, its cohort's fit kept and the limits that a question needs set."""
    folder = tmp_path_factory.mktemp("judged")
    path = Path(shutil.copy(empty_record, folder / "judged.db"))
    fouled_lab(folder / "exchange")
    with pytest.MonkeyPatch.context() as patch:
        patch.setenv("ELECTROLOG_NOW", JUDGED_AT)
        cli = Terminal(str(path), patch)
        cli.ok("import", str(folder / "exchange"))
        for rule, value in (("least-share-left", "60%"), ("accepted-risk", "5%"), ("oldest-calibration", "2400h")):
            cli.ok("limits", "set", rule, value)
        cli.ok("fit", "--analyte", "dopamine")
    return path


@pytest.fixture
def judged(judged_record: Path, tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Terminal:
    """With a copy of the judged lab; the clock stands an hour after its last entry."""
    monkeypatch.chdir(tmp_path)
    monkeypatch.setenv("ELECTROLOG_NOW", JUDGED_AT)
    return Terminal(str(shutil.copy(judged_record, tmp_path / "record.db")), monkeypatch)


@pytest.fixture
def terminal(monkeypatch: pytest.MonkeyPatch) -> Callable[[str], Terminal]:
    """With whatever database the test names."""
    return lambda db: Terminal(db, monkeypatch)
