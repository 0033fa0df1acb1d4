"""The backtest as pictures: are intervals as wide as they say, and where in its forecast did each reading fall?"""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING

from electrolog.answers.backtesting import Backtest
from electrolog.judge.backtest import PIT_CLASSES, Scored
from electrolog.show.figures import BLUE, BROWN, INK, LINES, QUIET, figure, labelled

if TYPE_CHECKING:
    from matplotlib.axes import Axes

_INKS = (BLUE, BROWN, QUIET, INK, BROWN)


def draw(path: Path, found: Backtest) -> None:
    with figure(path, 9.6, 4.4) as paper:
        left, right = paper.subplots(1, 2)
        draw_reliability(left, found)
        draw_pit(right, found.methods[0])


def draw_reliability(axes: Axes, found: Backtest) -> Axes:
    """Of central intervals of each level, the share that held its reading; grey: what chance alone may do (95 %)."""
    import numpy as np

    levels = np.linspace(0.0, 1.0, 101)
    count = len(found.methods[0].pit)
    chance = 1.96 * np.sqrt(levels * (1 - levels) / max(count, 1))
    axes.fill_between(
        levels, levels - chance, levels + chance, color=QUIET, alpha=0.2, linewidth=0, label="chance, 95 %"
    )
    axes.plot([0, 1], [0, 1], color=QUIET, linewidth=0.8)
    for ink, style, one in zip(_INKS, LINES, found.methods, strict=False):
        central = np.abs(np.asarray(one.pit) - 0.5) * 2
        axes.plot(levels, [(central <= level).mean() for level in levels], color=ink, linestyle=style, label=one.method)
    axes.set_xlim(0, 1)
    axes.set_ylim(0, 1)
    axes.legend(loc="upper left")
    return labelled(axes, f"Reliability: {count} forecasts", "level of the interval", "share of readings inside")


def draw_pit(axes: Axes, one: Scored) -> Axes:
    """Even where forecasts are honest; piled up at both ends where they are too sure of themselves."""
    import numpy as np

    width = 1 / PIT_CLASSES
    counts = np.asarray(one.pit_counts)
    places = (np.arange(PIT_CLASSES) + 0.5) * width
    expected = counts.sum() / PIT_CLASSES
    chance = 1.96 * np.sqrt(expected * (1 - width))
    axes.axhspan(
        max(0.0, expected - chance), expected + chance, color=QUIET, alpha=0.2, linewidth=0, label="chance, 95 %"
    )
    axes.axhline(expected, color=QUIET, linewidth=0.8)
    axes.bar(places, counts, width * 0.92, color="none", edgecolor=BLUE, hatch="//", linewidth=1.0, label=one.method)
    axes.set_xlim(0, 1)
    axes.set_ylim(0, max(counts.max(), expected + chance) * 1.2)
    axes.legend(loc="upper right", ncols=2)
    return labelled(axes, "PIT: where the reading fell", "quantile of the forecast", "readings")
