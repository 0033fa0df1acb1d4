"""Control charts as pictures: four to a rig, over the same readings."""

from __future__ import annotations

from collections.abc import Sequence
from pathlib import Path
from typing import TYPE_CHECKING, Any

from electrolog.answers.controlling import Controlled
from electrolog.show.figures import BLUE, BROWN, INK, MARKS, QUIET, figure, labelled, legend_above

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.lines import Line2D
    from numpy.typing import ArrayLike


def draw(path: Path, found: Sequence[Controlled]) -> None:
    with figure(path, 10, 5.2 * len(found) + 0.3) as paper:
        places = paper.subplots(2 * len(found), 2, squeeze=False)
        for row, one in enumerate(found):
            draw_individuals(places[2 * row][0], one)
            draw_range(places[2 * row + 1][0], one)
            draw_ewma(places[2 * row][1], one)
            draw_cusum(places[2 * row + 1][1], one)
        for axes in places.ravel().tolist():
            axes.xaxis.get_major_locator().set_params(integer=True)
        paper.legend(handles=_explained(), loc="outside lower center", ncols=4)


def draw_individuals(axes: Axes, one: Controlled) -> Axes:
    chart = one.individuals
    _charted(axes, chart.statistic, chart.centre, chart.lower, chart.upper, [at for at, _ in chart.signals])
    if one.baseline < len(one.points):
        axes.axvline(one.baseline + 0.5, color=QUIET, linestyle=":", linewidth=1)
    when = "" if not one.points else f", {one.points[0].at:%Y-%m-%d} to {one.points[-1].at:%Y-%m-%d}"
    return labelled(axes, f"{one.rig}: {one.what}", f"reading{when}", one.unit)


def draw_range(axes: Axes, one: Controlled) -> Axes:
    chart = one.moving_range
    flagged = [at - 1 for at, _ in chart.signals]
    _charted(axes, chart.statistic, chart.centre, chart.lower, chart.upper, flagged, first=2)
    return labelled(axes, "Moving range", "reading", one.unit)


def draw_ewma(axes: Axes, one: Controlled) -> Axes:
    chart = one.ewma
    flagged = [at for at, _ in chart.signals]
    _charted(axes, chart.statistic[1:], chart.centre, chart.lower[1:], chart.upper[1:], flagged)
    return labelled(axes, "EWMA: the smoothed value", "reading", one.unit)


def draw_cusum(axes: Axes, one: Controlled) -> Axes:
    sums = one.cusum
    along = range(1, len(sums.high) + 1)
    axes.plot(along, sums.high, marker=MARKS[2], color=BLUE, linewidth=0.9, label="above")
    axes.plot(along, -sums.low, marker=MARKS[4], color=BROWN, linewidth=0.9, linestyle="--", label="below")
    for limit in (sums.limit, -sums.limit):
        axes.axhline(limit, color=QUIET, linestyle="--", linewidth=0.9)
    axes.axhline(0, color=QUIET, linewidth=0.6)
    beyond = [(at, sums.high[at] if sums.high[at] >= sums.low[at] else -sums.low[at]) for at, _ in sums.signals]
    _ring(axes, [at + 1 for at, _ in beyond], [float(value) for _, value in beyond])
    legend_above(axes, 2)
    return labelled(axes, "CUSUM: what adds up", "reading", one.unit)


def _explained() -> list[Line2D]:
    from matplotlib.lines import Line2D

    looks: dict[str, dict[str, Any]] = {
        "centre": {"color": QUIET, "linewidth": 0.8},
        "limit": {"color": QUIET, "linestyle": "--", "linewidth": 0.9},
        "limits were set by the readings before": {"color": QUIET, "linestyle": ":", "linewidth": 1},
        "breaks a rule": _RING | {"linestyle": "none"},
    }
    return [Line2D([], [], label=label, **look) for label, look in looks.items()]


_RING: dict[str, Any] = {
    "marker": "o",
    "markersize": 11,
    "markerfacecolor": "none",
    "color": BROWN,
    "markeredgewidth": 1.6,
}


def _charted(
    axes: Axes,
    values: ArrayLike,
    centre: float,
    lower: ArrayLike,
    upper: ArrayLike,
    flagged: Sequence[int],
    first: int = 1,
) -> None:
    import numpy as np

    shown = np.asarray(values)
    along = np.arange(first, first + len(shown))
    axes.axhline(centre, color=QUIET, linewidth=0.8)
    for bound in (lower, upper):
        axes.plot(along, np.asarray(bound), color=QUIET, linestyle="--", linewidth=0.9, drawstyle="steps-mid")
    axes.plot(along, shown, marker=MARKS[0], color=INK, linewidth=0.9)
    chosen = sorted(set(flagged))
    _ring(axes, [int(along[at]) for at in chosen], [float(shown[at]) for at in chosen])


def _ring(axes: Axes, along: Sequence[float], values: Sequence[float]) -> None:
    """What broke a rule: a ring around the mark, for those who can't see its colour."""
    if along:
        axes.plot(along, values, linestyle="none", **_RING)
