"""Without arguments a command asks a person, with the last answers at hand; a program is refused as ever."""

from __future__ import annotations

import json
import os
import sys
from pathlib import Path
from typing import Any

import pytest


def spawned(db: str, arguments: list[str], answers: dict[str, str], answers_file: Path) -> tuple[int, str]:
    """The command at a terminal of its own; each question is answered by the first key that it begins with."""
    pty = pytest.importorskip("pty", reason="a terminal of its own needs a POSIX system")
    said, seen = b"", 0

    def read(descriptor: int) -> bytes:
        nonlocal said, seen
        said += os.read(descriptor, 4096)
        piece = said[seen:]
        if piece.rstrip().endswith(b":"):
            question = piece.decode().replace("\r", "").split("\n")[-1].split(" ")[0]
            os.write(descriptor, f"{answers.get(question, '')}\n".encode())
        seen = len(said)
        return piece

    os.environ["ELECTROLOG_ANSWERS"] = str(answers_file)
    try:
        status = pty.spawn([sys.executable, "-m", "electrolog", "--db", db, *arguments], read, lambda _: b"")
    finally:
        del os.environ["ELECTROLOG_ANSWERS"]
    return os.waitstatus_to_exitcode(status), said.decode()


def test_a_person_is_asked_for_what_a_command_takes(cli: Any, tmp_path: Path) -> None:
    kept = tmp_path / "answers.json"
    first = {"labels": "B9-01 B9-02", "method": "isopropanol", "at": "2026-02-01T09:00Z"}
    status, said = spawned(cli.db, ["clean"], first, kept)
    assert status == 0, said
    assert "Enter takes what stands in brackets" in said
    assert all("isopropanol" in cli.ok("life", probe).out for probe in ("B9-01", "B9-02"))
    assert json.loads(kept.read_text(encoding="utf-8"))["clean"]["method"] == "isopropanol"
    status, said = spawned(cli.db, ["clean"], {"labels": "B9-03", "at": "2026-02-01T09:00Z"}, kept)
    assert status == 0, said
    assert "[isopropanol]" in said
    assert "isopropanol" in cli.ok("life", "B9-03").out


def test_a_program_is_never_asked(cli: Any) -> None:
    told = cli.process("clean")
    assert (told.returncode, told.stdout) == (2, b"")
    assert b"Enter takes" not in told.stderr
    assert "Missing" in cli.refused("calibrate")


def test_a_command_that_needs_nothing_answers_at_once(cli: Any, tmp_path: Path) -> None:
    status, said = spawned(cli.db, ["shelf"], {}, tmp_path / "answers.json")
    assert status == 0
    assert "B07-01" in said
