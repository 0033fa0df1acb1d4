"""The cohort as a picture: every probe's loss with the typical one's, and the days that were off."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from pathlib import Path
from typing import TYPE_CHECKING, Any

from electrolog.answers.fan import Fan, Trail
from electrolog.answers.fitting import Day, FittedCohort
from electrolog.fouling.typical import TypicalLoss
from electrolog.show.figures import BLUE, BROWN, INK, LINES, MARKS, QUIET, figure, labelled
from electrolog.units import counted, shown_percent

if TYPE_CHECKING:
    from matplotlib.axes import Axes

MOST_KINDS = 6
LEAST_WEIGHT = 0.01


def draw(path: Path, found: FittedCohort, fan: Fan) -> None:
    """The kinds with the most probes; beneath them the calibration days."""
    kinds = sorted(fan.typical, key=lambda loss: -len(of_kind(fan, loss)))[:MOST_KINDS]
    columns = max(1, min(3, len(kinds)))
    rows = -(-len(kinds) // columns)
    with figure(path, max(7.2, 4.2 * columns), 3.6 * rows + 3.0) as paper:
        grid = paper.add_gridspec(rows + 1, columns)
        for place, loss in enumerate(kinds):
            axes = paper.add_subplot(grid[place // columns, place % columns])
            draw_fan(axes, loss, of_kind(fan, loss), found.shapes)
        draw_days(paper.add_subplot(grid[rows, :]), found.days)


def of_kind(fan: Fan, loss: TypicalLoss) -> list[Trail]:
    return [trail for trail in fan.trails if (trail.coating, trail.waveform) == (loss.coating, loss.waveform)]


def draw_fan(axes: Axes, loss: TypicalLoss, trails: Sequence[Trail], weights: Mapping[str, float]) -> Axes:
    """Share left against hours since the reference, worth as in vivo; a cleaning lets a probe's line rise."""
    hours, share = _in_one_line(trails)
    pale = max(0.08, min(0.6, 8.0 / max(1, len(trails))))
    axes.plot(hours, share, color=INK, alpha=pale, linewidth=0.8, marker=MARKS[0], markersize=3, label="each probe")
    axes.fill_between(loss.hours, loss.low, loss.high, color=BLUE, alpha=0.18, linewidth=0, label="typical, 90 %")
    shapes = [name for name, weight in weights.items() if weight >= LEAST_WEIGHT and name in loss.by_shape]
    for style, name in zip(LINES, shapes, strict=False):
        label = f"{name}, {shown_percent(weights[name])}"
        axes.plot(loss.hours, loss.by_shape[name], color=BLUE, linestyle=style, label=label)
    axes.set_ylim(0.0, max([1.25, *[one for trail in trails for one in trail.share if one < 2.0]]) * 1.03)
    axes.legend(loc="best", fontsize=7)
    kind = "bare" if loss.coating == "none" else loss.coating
    above = sum(one > axes.get_ylim()[1] for trail in trails for one in trail.share)
    title = f"{kind}, {loss.waveform}: {counted(len(trails), 'probe')}"
    title += f"; {counted(above, 'reading')} above the frame" if above else ""
    return labelled(axes, title, "exposure (h, worth as in vivo)", "share left")


def _in_one_line(trails: Sequence[Trail]) -> tuple[list[float], list[float]]:
    """Thousands of probes as one line with gaps: a line each takes a hundred times as long."""
    gap = float("nan")
    hours = [one for trail in trails for one in (*trail.hours, gap)]
    return hours, [one for trail in trails for one in (*trail.share, gap)]


def draw_days(axes: Axes, days: Sequence[Day]) -> Axes:
    """By how much all readings of a day stood off; a suspicious day is ringed and named."""
    from matplotlib import dates

    drawn: Any = dates  # without types of its own
    known = [day for day in days if day.effect.median is not None]
    along = [float(drawn.datestr2num(day.date)) for day in known]
    for at, day in zip(along, known, strict=True):
        low, high = (_percent(value) for value in (day.effect.low, day.effect.high))
        axes.plot([at, at], [low, high], color=QUIET, linewidth=1.0)
    axes.plot(along, [_percent(day.effect.median) for day in known], MARKS[0], color=INK, markersize=3.5, ls="none")
    axes.axhline(0.0, color=QUIET, linewidth=0.7)
    for at, day in zip(along, known, strict=True):
        if day.suspicious:
            _name(axes, at, day)
    axes.margins(y=0.15)
    if along:
        locator = drawn.AutoDateLocator(maxticks=9)
        axes.xaxis.set_major_locator(locator)
        axes.xaxis.set_major_formatter(drawn.ConciseDateFormatter(locator))
    else:
        axes.annotate("no calibration day", (0.5, 0.5), xycoords="axes fraction", ha="center", color=QUIET)
    return labelled(axes, "Calibration days: median and 90 % interval", "date", "all readings off by (%)")


def _name(axes: Axes, at: float, day: Day) -> None:
    value = _percent(day.effect.median)
    axes.plot([at], [value], "o", markersize=11, markerfacecolor="none", color=BROWN, markeredgewidth=1.6)
    axes.annotate(
        f"{day.date} {day.standard}".rstrip(),
        (at, value),
        xytext=(9, 0),
        textcoords="offset points",
        fontsize=7,
        va="center",
        color=BROWN,
    )


def _percent(share: float | None) -> float:
    return float("nan") if share is None else 100.0 * share
