"""A likely slip is asked about at a terminal, refused in a script, and written when it is meant."""

from __future__ import annotations

import os
import select
import signal
import sys
import time
from pathlib import Path
from typing import Any

import pytest

from tests.cli.conftest import POINTS

CAL = ("calibrate", "B07-01", "interim", "DA", "-w", "triangle")
RISING = ("0:0.1", "0.5:6.1,6.3", "1:12.2", "2:24")
SLIPS = {
    "a thousand times": (*CAL, "0:0.1", "0.5:6100", "1:12200", "2:24000"),
    "nanomolar as micromolar": (*CAL, "0:0.1", "500:6.1", "1000:12.2", "2000:24"),
    "ten times": (*CAL, "0:0.1", "0.5:61", "1:122", "2:240"),
    "an inverse factor": (*CAL, "--factor", "0.0838"),
    "a reversed point": (*CAL, "0:0.1", "0.5:12.2", "1:6.1", "2:24"),
    "negative currents": ("calibrate", "B9-01", "pre", "DA", "0:0.1", "1:-12", "2:-24", "-w", "triangle"),
    "the same points again": (
        "calibrate",
        "B07-03",
        "pre",
        "DA",
        *POINTS,
        "-w",
        "triangle",
        "--at",
        "2026-01-07T11:10Z",
    ),
    "another analyte's standard": (
        "calibrate",
        "B9-01",
        "pre",
        "5-HT",
        *RISING,
        "-w",
        "triangle",
        "--standard",
        "s-48-da",
    ),
    "the future": ("clean", "B9-01", "-m", "acetone", "--at", "tomorrow 23:00"),
    "a future exposure": ("expose", "B9-01", "--for", "2h", "-s", "slice", "--start", "tomorrow 23:00"),
    "before it was made": ("clean", "B9-01", "-m", "acetone", "--at", "2025-12-01T10:00Z"),
    "after it was retired": ("clean", "B07-02", "-m", "acetone"),
    "two places at once": ("expose", "B07-01", "--for", "2h", "-s", "slice", "--start", "2026-01-08T10:00Z"),
    "a very long run": ("expose", "B9-01", "--for", "240h", "-s", "in-vivo"),
    "in the middle of a run": ("clean", "B07-01", "-m", "acetone", "--at", "2026-01-08T10:00Z"),
}


@pytest.mark.parametrize("slip", SLIPS)
def test_without_a_terminal_a_slip_is_refused(cli: Any, slip: str) -> None:
    said = cli.refused(*SLIPS[slip])
    assert "--yes" in said


@pytest.mark.parametrize("slip", SLIPS)
def test_with_yes_it_is_written(cli: Any, slip: str) -> None:
    before = cli.entries()
    cli.ok(*SLIPS[slip], "--yes")
    assert cli.entries() == before + 1


def test_what_was_doubted_and_confirmed_is_said_to_a_program(cli: Any) -> None:
    (entered,) = cli.ok(*SLIPS["after it was retired"], "--yes", "--json").json
    assert "was retired on" in entered["doubts"][0]


def test_a_doubt_is_of_its_own_kind_for_a_program(cli: Any) -> None:
    answer = cli(*SLIPS["after it was retired"], "--json")
    assert (answer.status, answer.out) == (2, "")
    assert '"kind": "doubtful"' in answer.err


@pytest.mark.parametrize(
    "arguments",
    [
        (*CAL, "0:0.1", "0.5:4.2", "1:8.1", "2:16.3"),
        ("clean", "B9-01", "-m", "acetone"),
        ("expose", "B9-01", "--for", "6h", "-s", "in-vivo"),
        ("expose", "B07-01", "--for", "2h", "-s", "slice", "--start", "2026-01-08T11:00Z"),
        ("inspect", "B07-01", "--at", "2026-01-08T10:00Z", "--noise", "80pA"),
    ],
    ids=lambda arguments: arguments[0],
)
def test_what_is_usual_is_not_asked_about(cli: Any, arguments: tuple[str, ...]) -> None:
    cli.ok(*arguments)


def test_one_doubtful_probe_of_several_writes_none(cli: Any) -> None:
    assert "B07-02 was retired" in cli.refused("clean", "B07-01..B07-03", "-m", "acetone")


@pytest.mark.skipif(sys.platform == "win32", reason="there is no pseudo-terminal")
@pytest.mark.parametrize(
    ("typed", "status", "written"), [("y\n", 0, 1), ("n\n", 130, 0), ("\n", 130, 0), ("\x03", 130, 0)]
)
def test_at_a_terminal_it_is_asked(cli: Any, typed: str, status: int, written: int) -> None:
    before = cli.entries()
    said, found = at_a_terminal(["--db", cli.db, *SLIPS["after it was retired"]], typed)
    assert "was retired on" in said
    assert "Write it as it stands? [y/N]" in said
    assert found == status
    assert cli.entries() == before + written


def at_a_terminal(arguments: list[str], typed: str) -> tuple[str, int]:
    """What a pseudo-terminal showed, and the exit status.

    Typed again while nothing happens: an interrupt that comes just before Python listens is noticed at the next key.
    """
    import pty

    child, master = pty.fork()
    if child == 0:
        signal.signal(signal.SIGINT, signal.SIG_DFL)  # a shell makes what it starts in the background deaf to it
        os.execv(sys.executable, [sys.executable, "-m", "electrolog", *arguments])  # noqa: S606
    said, deadline = b"", time.monotonic() + 60
    while time.monotonic() < deadline:
        if not select.select([master], [], [], 2.0)[0]:
            if b"[y/N]" in said:
                os.write(master, typed.encode())
            continue
        try:
            part = os.read(master, 4096)
        except OSError:  # Linux's way to say that the other end is gone
            break
        if not part:
            break
        if b"[y/N]" in part:
            os.write(master, typed.encode())
        said += part
    else:
        os.kill(child, signal.SIGKILL)
    os.close(master)
    return said.decode(), os.waitstatus_to_exitcode(os.waitpid(child, 0)[1])


def test_the_scratch_folder_holds_nothing_but_the_record(cli: Any, tmp_path: Path) -> None:
    cli.refused(*SLIPS["the future"])
    assert {path.name.split("-")[0] for path in tmp_path.iterdir()} == {"record.db"}


def test_a_calibration_entered_twice_names_the_first_and_how_to_take_it_out(cli: Any) -> None:
    said = cli.refused(*SLIPS["the same points again"])
    assert "B07-03: the same 6 points as C0044 of " in said
    assert "entered twice? `electrolog strike calibration C0044` takes that one out" in said
    cli.ok(*SLIPS["the same points again"][:-1], "2026-01-09T11:10Z")  # of another day they are no copy
    cli.ok("strike", "calibration", "C0044", "--why", "twice")
    cli.ok(*SLIPS["the same points again"])
