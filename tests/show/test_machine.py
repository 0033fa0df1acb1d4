"""Answers for programs: JSON without NaN, CSV by RFC 4180, the same bytes on any stream."""

from __future__ import annotations

import csv
import io
import json
import math
from dataclasses import dataclass
from datetime import UTC, date, datetime
from typing import Any

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from electrolog.show.machine import plain, print_csv, print_json


@dataclass(frozen=True)
class Found:
    at: datetime
    share: float
    names: tuple[str, ...]


FOUND = Found(datetime(2026, 3, 14, 13, 30, tzinfo=UTC), math.nan, ("a", "µ"))


def test_what_json_does_not_know_is_said_in_what_it_knows() -> None:
    assert plain(FOUND) == {"at": "2026-03-14T13:30:00Z", "share": None, "names": ["a", "µ"]}
    assert plain({1: date(2026, 3, 14), "x": (math.inf, -math.inf, True, 3, None)}) == {
        "1": "2026-03-14",
        "x": [None, None, True, 3, None],
    }


def test_numpys_numbers_are_numbers() -> None:
    assert plain([np.float64(0.5), np.float32(0.5), np.int64(3), np.array([1.0, np.nan])]) == [
        0.5,
        0.5,
        3.0,
        [1.0, None],
    ]


json_values = st.recursive(
    st.none() | st.booleans() | st.integers(-(2**53), 2**53) | st.floats() | st.text(),
    lambda inner: st.lists(inner, max_size=4) | st.dictionaries(st.text(max_size=5), inner, max_size=4),
    max_leaves=12,
)


@given(json_values)
def test_any_answer_is_one_strict_document(value: Any) -> None:
    text = json.dumps(plain(value), allow_nan=False)
    assert json.loads(text) == plain(value)


def test_json_is_ascii_and_not_wrapped(capsys: pytest.CaptureFixture[str], monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setenv("COLUMNS", "40")
    print_json({"note": "µ" * 500, "found": FOUND})
    text = capsys.readouterr().out
    assert text.isascii()
    assert json.loads(text)["note"] == "µ" * 500


def csv_of(monkeypatch: pytest.MonkeyPatch, rows: list[dict[str, Any]], columns: list[str] | None = None) -> str:
    stream = io.TextIOWrapper(io.BytesIO(), encoding="ascii")
    monkeypatch.setattr("sys.stdout", stream)
    print_csv(rows, columns)
    return stream.buffer.getvalue().decode("utf-8")  # type: ignore[attr-defined]


def test_csv_is_utf8_whatever_the_stream_is(monkeypatch: pytest.MonkeyPatch) -> None:
    text = csv_of(
        monkeypatch, [{"a": 'µ, "x"\nline', "b": 2.0, "c": None, "d": 0.1, "e": ["x", 1]}, {"a": "y", "b": 1}]
    )
    first, second = csv.DictReader(io.StringIO(text, newline=""), strict=True)
    assert first == {"a": 'µ, "x"\nline', "b": "2", "c": "", "d": "0.1", "e": '["x", 1]'}
    assert second["a"] == "y"
    assert text.count("\r\n") == 3


def test_csv_without_rows_keeps_its_head(monkeypatch: pytest.MonkeyPatch) -> None:
    assert csv_of(monkeypatch, [], ["a", "b"]) == "a,b\r\n"


@pytest.mark.parametrize("text", ["=1+1", "+1", "@x", "\tx", "\rx", "-1+1", "-cmd"])
def test_a_spreadsheet_runs_no_cell(monkeypatch: pytest.MonkeyPatch, text: str) -> None:
    (row,) = csv.DictReader(io.StringIO(csv_of(monkeypatch, [{"a": text, "b": -1.5}]), newline=""))
    assert row["a"][0] not in "=+@-\t\r"
    assert row["b"] == "-1.5"


def test_potentials_are_no_formula(monkeypatch: pytest.MonkeyPatch) -> None:
    assert csv_of(monkeypatch, [{"vertices_v": "-0.4 1.3 -0.4"}]).splitlines()[1] == "-0.4 1.3 -0.4"
