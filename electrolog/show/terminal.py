"""Charts in the terminal: one look, no colour, nothing where nobody looks; their library is loaded where used."""

from __future__ import annotations

import math
import sys
from collections.abc import Sequence
from enum import StrEnum
from typing import Any

from electrolog.show.text import width

HEIGHT = 16
WIDEST = 110
_BLOCKS = "▁▂▃▄▅▆▇█"
_NEEDED = _BLOCKS + "│─░┌┐└┘┤┬"


class Drawing(StrEnum):
    """What an answer looks like to whoever asked: a chart, sentences for a screen reader, or neither (a pipe)."""

    CHART = "chart"
    PLAIN = "plain"
    NONE = "none"


def drawing(chart: bool, plain: bool) -> Drawing:
    if plain:
        return Drawing.PLAIN
    if chart or sys.stdout.isatty():
        return Drawing.CHART if _can_draw() else Drawing.PLAIN
    return Drawing.NONE


def _can_draw() -> bool:
    """An older code page has no blocks and lines; their escapes would be noise."""
    try:
        _NEEDED.encode(sys.stdout.encoding or "ascii")
    except (LookupError, UnicodeEncodeError):
        return False
    return True


class Chart:
    """Points, intervals, bands and lines on axes that name their units."""

    def __init__(
        self, along: str, up: str, *, x: tuple[float, float], y: tuple[float, float], rows: int = HEIGHT
    ) -> None:
        import plotext

        self._library: Any = plotext
        self._figure: Any = plotext.figure
        self._figure.clear()
        self._figure.theme("colorless")
        self._width = min(width(), WIDEST)
        self._figure.plot_size(self._width, rows)
        self._up = up
        self._figure.label(along, "x")
        self._x, self._y = _room(*x), _room(*y)
        for axis, limits, about in (("x", self._x, 6), ("y", self._y, max(2, 6 * rows // HEIGHT))):
            ticks = round_ticks(*limits, about)
            self._figure.ruler(axis).lim(*limits)
            self._figure.ruler(axis).ticks(ticks, [f"{tick:g}" for tick in ticks])

    def points(self, x: Sequence[float], y: Sequence[float], sign: str) -> None:
        if x:
            self._figure.draw(self._figure.signal(list(x), list(y), marker=sign))

    def interval(self, x: float, low: float, high: float, sign: str = "│") -> None:
        self._figure.draw(self._figure.segment([x, x], [low, high], marker=sign))

    def curve(self, x: Sequence[float], y: Sequence[float], sign: str) -> None:
        """Straight from point to point."""
        for k in range(len(x) - 1):
            self._figure.draw(self._figure.segment([x[k], x[k + 1]], [y[k], y[k + 1]], marker=sign))

    def band(self, x: Sequence[float], low: Sequence[float], high: Sequence[float]) -> None:
        """Shaded in every column, so that it is seen for an area and not for points."""
        if len(x) < 2:
            return
        columns = max(2, round(self._width * (x[-1] - x[0]) / (self._x[1] - self._x[0])) + 1)
        for k in range(columns):
            at = x[0] + (x[-1] - x[0]) * k / (columns - 1)
            self.interval(at, _between(x, low, at), _between(x, high, at), "░")

    def level(self, y: float, sign: str = "-") -> None:
        self._figure.draw(self._figure.segment([self._x[0], self._x[1]], [y, y], marker=sign))

    def text(self) -> list[str]:
        drawn = self._library.uncolorize(str(self._figure.build()))
        self._figure.clear()
        return [self._up, *[line.rstrip() for line in drawn.splitlines()]]


def round_ticks(low: float, high: float, about: int = 6) -> list[float]:
    """Steps of 1, 2 or 5 times a power of ten."""
    rough = (high - low) / about
    power = 10.0 ** math.floor(math.log10(rough))
    step = next(times * power for times in (1, 2, 5, 10) if times * power >= rough * 0.999)
    first, last = math.ceil(low / step - 1e-9), math.floor(high / step + 1e-9)
    return [float(f"{place * step:.12g}") for place in range(first, last + 1)]


def _room(low: float, high: float) -> tuple[float, float]:
    """Axes of no length draw nothing."""
    return (low, high) if high > low else (low, low + (abs(low) or 1.0))


def _between(x: Sequence[float], y: Sequence[float], at: float) -> float:
    for k in range(len(x) - 1):
        if at <= x[k + 1]:
            span = x[k + 1] - x[k]
            return y[k] + (y[k + 1] - y[k]) * ((at - x[k]) / span if span else 1.0)
    return y[-1]


def trend(values: Sequence[float | None], most: int = 8) -> str:
    """The last few values as blocks above zero, the largest full: a dot where one is unknown or not above zero."""
    last = list(values)[-most:]
    top = max((value for value in last if value is not None), default=0.0)
    if len(last) < 2 or top <= 0:
        return ""
    return "".join(_block(value, top) for value in last)


def _block(value: float | None, top: float) -> str:
    if value is None or value <= 0:
        return "·"
    return _BLOCKS[min(len(_BLOCKS) - 1, max(0, round(value / top * len(_BLOCKS)) - 1))]
