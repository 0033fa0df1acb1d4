"""Charts in the terminal: round ticks, honest trends, nothing where nobody looks, any width."""

from __future__ import annotations

import io
import sys
from typing import Any

import pytest

from electrolog.show.terminal import Chart, Drawing, drawing, round_ticks, trend


@pytest.mark.parametrize(
    ("low", "high", "ticks"),
    [
        (0, 10, [0, 2, 4, 6, 8, 10]),
        (0, 17.5, [0, 5, 10, 15]),
        (0.0003, 0.0011, [0.0004, 0.0006, 0.0008, 0.001]),
        (-3, 3, [-3, -2, -1, 0, 1, 2, 3]),
    ],
)
def test_ticks_are_round_and_inside(low: float, high: float, ticks: list[float]) -> None:
    assert round_ticks(low, high) == ticks


def test_a_trend_stands_on_zero() -> None:
    assert trend([10, 5, 2.5]) == "█▄▂"
    assert trend([10, 9.9]) == "██"  # one percent is no fall to be seen


def test_a_trend_tells_the_unknown_from_the_small() -> None:
    assert trend([10, None, 0.01]) == "█·▁"
    assert trend([10, -1]) == "█·"


def test_one_reading_or_none_is_no_trend() -> None:
    assert [trend(values) for values in ([], [3.0], [None, None])] == ["", "", ""]


def test_a_trend_is_of_the_last_eight() -> None:
    assert trend([100.0, *[1.0] * 8]) == "█" * 8


def test_a_pipe_gets_no_drawing_unless_asked(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(sys, "stdout", io.TextIOWrapper(io.BytesIO(), encoding="utf-8"))
    assert drawing(chart=False, plain=False) is Drawing.NONE
    assert drawing(chart=True, plain=False) is Drawing.CHART
    assert drawing(chart=True, plain=True) is Drawing.PLAIN


def test_an_older_code_page_gets_sentences(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(sys, "stdout", io.TextIOWrapper(io.BytesIO(), encoding="cp1252"))
    assert drawing(chart=True, plain=False) is Drawing.PLAIN


@pytest.mark.parametrize("columns", [40, 60, 80, 200])
def test_a_chart_fits_any_width_and_has_no_colour(columns: int, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setenv("COLUMNS", str(columns))
    lines = full_chart().text()
    assert max(map(len, lines)) <= columns
    assert "\x1b" not in "".join(lines)
    assert all(sign in "".join(lines) for sign in "o│░-")
    assert "hours" in lines[-1]


def full_chart() -> Any:
    chart = Chart("hours", "nA/µM", x=(0.0, 10.0), y=(0.0, 12.0))
    chart.band([6.0, 10.0], [7.0, 5.0], [9.0, 8.0])
    chart.level(4.0)
    chart.interval(2.0, 8.0, 12.0)
    chart.points([0.0, 2.0], [11.0, 10.0], "o")
    return chart


def test_the_next_chart_begins_empty(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setenv("COLUMNS", "60")
    full_chart().text()
    assert "o" not in "".join(Chart("h", "nA", x=(0.0, 1.0), y=(0.0, 1.0)).text()[1:-1])


def test_a_span_of_nothing_is_still_an_axis(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setenv("COLUMNS", "60")
    chart = Chart("h", "nA", x=(0.0, 0.0), y=(5.0, 5.0))
    chart.points([0.0], [5.0], "o")
    assert "o" in "".join(chart.text())
