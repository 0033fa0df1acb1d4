"""Charts for a page: shapes in pixels, with what each says on hover. The template writes them out, escaped."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field

from electrolog.show.terminal import round_ticks
from electrolog.units import shown_number

LEFT, RIGHT, TOP, BOTTOM = 46.0, 12.0, 20.0, 36.0
_DOTS = {  # paths about a point, so that kinds differ in form and not in colour alone
    "circle": "m-3.2,0a3.2,3.2 0 1,0 6.4,0a3.2,3.2 0 1,0 -6.4,0",
    "ring": "m-6,0a6,6 0 1,0 12,0a6,6 0 1,0 -12,0",
    "square": "m-3.4,-3.4h6.8v6.8h-6.8z",
    "down": "m0,4l-4,-7h8z",
    "diamond": "m0,-4.4l4.4,4.4l-4.4,4.4l-4.4,-4.4z",
    "cross": "m-3.4,-3.4l6.8,6.8m0,-6.8l-6.8,6.8",
    "tick": "m0,-5v10",
}


@dataclass(frozen=True)
class Shape:
    """An SVG path with its look (a class of the page's style) and what it says on hover."""

    path: str
    look: str
    said: str = ""


@dataclass(frozen=True)
class Tick:
    at: float
    label: str


@dataclass
class Plot:
    """Axes with their units; what lies outside is drawn at the edge, so that nothing hides beyond it.

    x_labels: where numbers would not do; a place and its words each.
    """

    title: str
    along: str
    up: str
    x: tuple[float, float]
    y: tuple[float, float]
    width: float = 640.0
    height: float = 280.0
    x_labels: Sequence[tuple[float, str]] = ()
    shapes: list[Shape] = field(default_factory=list)
    legend: list[tuple[str, str, str]] = field(default_factory=list)  # path, look, words

    def __post_init__(self) -> None:
        self.x, self.y = _room(*self.x), _room(*self.y)

    def px(self, value: float) -> float:
        share = (value - self.x[0]) / (self.x[1] - self.x[0])
        return round(LEFT + min(max(share, 0.0), 1.0) * (self.width - LEFT - RIGHT), 1)

    def py(self, value: float) -> float:
        share = (value - self.y[0]) / (self.y[1] - self.y[0])
        return round(self.height - BOTTOM - min(max(share, 0.0), 1.0) * (self.height - TOP - BOTTOM), 1)

    @property
    def x_ticks(self) -> list[Tick]:
        labels = self.x_labels or [(value, f"{value:g}") for value in round_ticks(*self.x, about=6)]
        return [Tick(self.px(value), words) for value, words in labels]

    @property
    def y_ticks(self) -> list[Tick]:
        return [Tick(self.py(value), f"{value:g}") for value in round_ticks(*self.y, about=5)]

    @property
    def frame(self) -> str:
        return f"M{LEFT:g},{TOP:g}V{self.height - BOTTOM:g}H{self.width - RIGHT:g}"

    def line(self, x: Sequence[float], y: Sequence[float], look: str, said: str = "") -> None:
        if len(x) > 1:
            self.shapes.append(Shape("M" + "L".join(self._points(x, y)), look, said))

    def band(self, x: Sequence[float], low: Sequence[float], high: Sequence[float], look: str, said: str = "") -> None:
        if len(x) > 1:
            edge = [*self._points(x, low), *reversed(self._points(x, high))]
            self.shapes.append(Shape("M" + "L".join(edge) + "z", look, said))

    def bar(self, x: float, low: float, high: float, look: str, said: str = "") -> None:
        self.shapes.append(Shape(f"M{self.px(x):g},{self.py(low):g}V{self.py(high):g}", look, said))

    def box(self, x: tuple[float, float], y: tuple[float, float], look: str, said: str = "") -> None:
        (left, right), (low, high) = map(self.px, x), map(self.py, y)
        self.shapes.append(Shape(f"M{left:g},{low:g}V{high:g}H{right:g}V{low:g}z", look, said))

    def level(self, y: float, look: str, said: str = "") -> None:
        self.shapes.append(Shape(f"M{LEFT:g},{self.py(y):g}H{self.width - RIGHT:g}", look, said))

    def dot(self, x: float, y: float, form: str, look: str, said: str = "") -> None:
        self.shapes.append(Shape(f"M{self.px(x):g},{self.py(y):g}{_DOTS[form]}", look, said))

    def explain(self, form: str, look: str, words: str) -> None:
        """A row of the legend: a form of a dot, or `line`, `band`."""
        path = {"line": "M1,8h20", "band": "M1,3h20v10h-20z"}.get(form) or f"M11,8{_DOTS[form]}"
        if (path, look, words) not in self.legend:
            self.legend.append((path, look, words))

    def _points(self, x: Sequence[float], y: Sequence[float]) -> list[str]:
        return [f"{self.px(a):g},{self.py(b):g}" for a, b in zip(x, y, strict=True)]


def _room(low: float, high: float) -> tuple[float, float]:
    return (low, high) if high > low else (low, low + (abs(low) or 1.0))


def trend_path(values: Sequence[float | None], width: float = 60.0, height: float = 16.0) -> str:
    """A probe's readings in the shelf's row, on zero; empty for fewer than two known ones."""
    known = [(place, value) for place, value in enumerate(values) if value is not None and value >= 0]
    top = max((value for _, value in known), default=0.0)
    if len(known) < 2 or top <= 0:
        return ""
    last = len(values) - 1
    points = [f"{place / last * width:.0f},{height - value / top * (height - 2):.0f}" for place, value in known]
    return "M" + "L".join(points)


def said(value: float | None, unit: str) -> str:
    return f"{shown_number(value)} {unit}"
