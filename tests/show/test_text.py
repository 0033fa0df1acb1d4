"""User text made safe to show, in any encoding and at any width."""

from __future__ import annotations

import io

import pytest
from hypothesis import given
from hypothesis import strategies as st

from electrolog.show.text import one_line, prepare_streams, safe, width


@given(st.text())
def test_nothing_that_acts_on_a_terminal_comes_through(text: str) -> None:
    assert all(sign.isprintable() or sign in "\n\t" or ord(sign) > 0x9F for sign in safe(text))
    assert "\n" not in one_line(text)


@given(st.text(st.characters(exclude_categories=["C", "Z"])))
def test_what_can_be_seen_stays_as_it_is(text: str) -> None:
    assert safe(text) == text


@pytest.mark.parametrize(
    ("text", "shown"),
    [
        ("\x1b[31mred", r"\x1b[31mred"),
        ("a\x07b\x9bc", r"a\x07b\x9bc"),
        ("safe\u202eevil", r"safe\u202eevil"),
        ("\ud800", r"\ud800"),
        ("שלום\u200f", "שלום\u200f"),
        ("[a12] [/]", "[a12] [/]"),
        (None, "None"),
    ],
)
def test_escapes_are_spelled_out(text: object, shown: str) -> None:
    assert safe(text) == shown


@pytest.mark.parametrize(
    ("encoding", "shown"),
    [
        ("ascii", r"5 uM +- 0.2 nA ->\U0001f9ea"),
        ("cp1252", r"5 µM ± 0.2 nA ->\U0001f9ea"),
        ("utf-8", "5 µM ± 0.2 nA →🧪"),
    ],
)
def test_a_stream_takes_any_text(monkeypatch: pytest.MonkeyPatch, encoding: str, shown: str) -> None:
    stream = io.TextIOWrapper(io.BytesIO(), encoding=encoding)
    monkeypatch.setattr("sys.stdout", stream)
    prepare_streams()
    stream.write("5 µM ± 0.2 nA →🧪")
    stream.flush()
    assert stream.buffer.getvalue().decode(encoding) == shown  # type: ignore[attr-defined]


@pytest.mark.parametrize(
    ("columns", "found"), [(None, 100), ("60", 60), ("1", 40), ("0", 100), ("nonsense", 100), ("-5", 100)]
)
def test_the_width_is_the_terminals_or_what_is_said(
    monkeypatch: pytest.MonkeyPatch, columns: str | None, found: int
) -> None:
    if columns is not None:
        monkeypatch.setenv("COLUMNS", columns)
    assert width(io.StringIO()) == found
