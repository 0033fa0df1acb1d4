"""Text that people type prints as typed and breaks nothing: no markup, no escape, no encoding."""

from __future__ import annotations

import os
import subprocess
import sys
from typing import Any

import pytest

TEXTS = {
    "markup": "lot [a12] ok [/] [bold]x[/bold] [link=x]",
    "backslashes": r"\[a] \n \x1b C:\new",
    "emoji": "🧪 👩‍🔬 :smile:",
    "right to left": "שלום \u200f abc",
    "accents": "é è ß Ω µ μ − ≤",
    "percent and braces": "%s {0} {name} %(x)s $HOME `id`",
    "quotes": "'\"; DROP TABLE journal; --",
    "ten thousand": "x" * 10_000,
    "ten thousand brackets": "[" * 10_000,
    "spaces": "a   b",
}
ACTING = {
    "colour": "\x1b[31mred",
    "a title": "\x1b]0;owned\x07",
    "a cleared screen": "\x1b[2J\x1b[H",
    "eight-bit escapes": "\x9b31m \x85 \x90",
    "backspaces": "safe\b\b\b\bevil",
    "a returned carriage": "safe\revil",
    "reordering": "safe\u202eevil\u2066x\u2069",
}


def visible(text: str) -> str:
    return "".join(text.split())


@pytest.mark.parametrize("text", TEXTS.values(), ids=TEXTS)
def test_text_prints_as_typed(cli: Any, text: str) -> None:
    said = cli.ok("note", "B9-01", text).out
    assert visible(text) in visible(said)
    assert visible(text) in visible(cli.ok("life", "B9-01").out)
    assert cli.ok("life", "B9-01", "--json").json["events"][0]["note"] == text
    assert len(cli.ok("shelf", "--search", text[:40], "--json").json) == 1
    assert cli.ok("verify").out


@pytest.mark.parametrize("text", ACTING.values(), ids=ACTING)
def test_text_cannot_act_on_the_terminal(cli: Any, text: str) -> None:
    shown = [cli.ok("note", "B9-01", text).out, cli.ok("life", "B9-01").out, cli.ok("journal").out]
    shown += [cli.refused("life", text), cli.refused(text), cli.refused("coat", "B9-01", "-m", text)]
    shown.append(cli.refused("amend", "probe", "B9-01", text, "--why", "x"))
    acting = [c for c in text if not c.isprintable() and c != "\n"]
    assert acting
    assert [(c, one) for c in acting for one in shown if c in one] == []
    assert cli.ok("life", "B9-01", "--json").json["events"][0]["note"] == text


@pytest.mark.parametrize(
    "text", [t for t in TEXTS.values() if len(t) < 100], ids=[n for n, t in TEXTS.items() if len(t) < 100]
)
def test_any_text_may_be_a_label(cli: Any, text: str) -> None:
    label = text.replace(",", "").replace("..", "")
    cli.ok("new", label)
    assert cli.ok("life", label, "--json").json["electrode"]["electrode"] == label
    assert visible(label) in visible(cli.ok("shelf", "--search", label[:20]).out)


@pytest.mark.parametrize(
    "label", ["\x1b[31mred", "a\nb", "a\tb", "a\rb", "a\0b", "a\u2028b", "x" * 201, "", " ", "\u200f", "\u200b\u2060"]
)
def test_a_label_nobody_could_type_again_is_refused(cli: Any, label: str) -> None:
    cli.refused("new", label)


def test_a_command_line_that_is_no_utf8_is_refused(cli: Any) -> None:
    assert "not UTF-8" in cli.refused("note", "B9-01", "a\udcffb")
    assert "not UTF-8" in cli.refused("life", "\ud800")


def test_a_long_name_is_shortened_in_a_refusal(cli: Any) -> None:
    for arguments in (("life", "x" * 10_000), ("x" * 10_000,), ("coat", "B9-01", "-m", "x" * 10_000)):
        assert len(cli.refused(*arguments)) < 1000


@pytest.mark.parametrize("encoding", ["ascii", "cp1252", "utf-8"])
@pytest.mark.parametrize(
    "arguments", [("life", "B9-01"), ("shelf",), ("life", "B9-01", "--json"), ("life", "B9-01", "--csv")]
)
def test_any_encoding_of_the_stream_will_do(cli: Any, encoding: str, arguments: tuple[str, ...]) -> None:
    cli.ok("note", "B9-01", "5 µM ± 0.2, − 🧪 שלום [x]")
    done = cli.process(*arguments, PYTHONIOENCODING=encoding)
    assert (done.returncode, done.stderr) == (0, b"")
    text = done.stdout.decode("utf-8" if "--csv" in arguments else encoding)
    assert "untested" in text or "inspection" in text
    assert r"\u2500" not in text
    if arguments == ("life", "B9-01"):
        assert ("5 uM +- 0.2" if encoding == "ascii" else "5 µM ± 0.2") in text
        assert "[x]" in text


def test_a_refusal_too_can_be_said_in_any_encoding(cli: Any) -> None:
    done = cli.process("life", "µ🧪", PYTHONIOENCODING="ascii")
    assert done.returncode == 2
    assert b"no probe is called" in done.stderr


def test_a_reader_that_goes_away_is_no_failure(cli: Any) -> None:
    """As in `electrolog list words | head -1`."""
    command = [sys.executable, "-m", "electrolog", "--db", cli.db, "list", "words"]
    for arguments in ((), ("--json",), ("--csv",)):
        process = subprocess.Popen([*command, *arguments], stdout=subprocess.PIPE, stderr=subprocess.PIPE)
        assert process.stdout is not None
        process.stdout.close()
        assert process.communicate(timeout=60)[1] == b""
        assert process.returncode == 0


def test_output_carries_no_colour(cli: Any) -> None:
    """Meaning is never carried by colour, so there is none to switch off."""
    for name in ("FORCE_COLOR", "NO_COLOR"):
        for arguments in (("shelf",), ("life", "B07-01"), ("--help",), ("coat", "--help")):
            done = cli.process(*arguments, **{name: "1"})
            assert done.returncode == 0
            assert b"\x1b" not in done.stdout + done.stderr


@pytest.mark.parametrize("columns", ["60", "40", "1", "0", "nonsense"])
def test_any_width_will_do(cli: Any, columns: str) -> None:
    cli.ok("note", "B9-01", "word " * 50 + "x" * 300)
    for arguments in (("shelf",), ("life", "B9-01"), ("calibrations", "B07-01"), ("--help",)):
        done = cli.process(*arguments, COLUMNS=columns)
        assert (done.returncode, done.stderr) == (0, b"")
        if columns == "60":
            assert max(len(line.rstrip()) for line in done.stdout.decode().splitlines()) <= 60


def test_help_loads_nothing_heavy(cli: Any) -> None:
    code = (
        "import sys; from electrolog.cli.main import main; main(['--help']); main(['coat', '--help']);"
        "print([m for m in ('numpy', 'pandas', 'scipy', 'sqlalchemy', 'alembic', 'rich') if m in sys.modules])"
    )
    done = subprocess.run(
        [sys.executable, "-c", code], capture_output=True, text=True, encoding="utf-8", check=True, env=os.environ
    )
    assert done.stdout.splitlines()[-1] == "[]"
