"""Groups of probes as a picture: every probe's value beside its group's mean, and how long each group lasts."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from pathlib import Path
from typing import TYPE_CHECKING

from electrolog.answers.comparing import LOSS, Compared
from electrolog.judge.compare import Estimate, Groups, Lives
from electrolog.show.figures import BLUE, BROWN, INK, LINES, MARKS, QUIET, figure, labelled, legend_beside

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from numpy.typing import ArrayLike

MOST_CURVES = 8
_INKS = (BLUE, BROWN, INK, QUIET)


def draw(path: Path, found: Compared, groups: Groups) -> None:
    panels = len(groups.values) + bool(groups.lives)
    with figure(path, max(7.2, 4.4 * panels), 4.2) as paper:
        places = paper.subplots(1, panels, squeeze=False).ravel().tolist()
        for axes, (measure, values) in zip(places, groups.values.items(), strict=False):
            known = [one for one in found.comparison.estimates if one.measure == measure]
            draw_spread(axes, measure, values, known)
        if groups.lives:
            draw_survival(places[-1], groups.lives)


def draw_spread(axes: Axes, measure: str, values: Mapping[str, ArrayLike], estimates: Sequence[Estimate]) -> Axes:
    """One mark per probe, spread sideways; beside them the group's mean with its 95 % interval."""
    import numpy as np

    names = sorted(values)
    for place, name in enumerate(names):
        own = np.sort(np.asarray(values[name], dtype=float))
        aside = 0.22 * (((np.arange(len(own)) * 0.618) % 1.0) - 0.5)
        axes.plot(place + aside, own, MARKS[0], color=INK, alpha=0.6, markersize=4)
    for one in estimates:
        _mean(axes, names.index(one.group) + 0.28, one)
    axes.plot([], [], MARKS[0], color=INK, alpha=0.6, markersize=4, label="each probe")
    axes.plot([], [], MARKS[3], color=BLUE, label="mean, 95 % interval")
    axes.set_xticks(range(len(names)), [_short(name) for name in names], rotation=30 if len(names) > 3 else 0)
    axes.set_xlim(-0.5, max(len(names) - 0.2, 0.8))
    axes.margins(y=0.18)
    if all((np.asarray(own) >= 0).all() for own in values.values()):
        axes.set_ylim(bottom=0.0)
    axes.legend(loc="upper right", ncols=2)
    return labelled(axes, measure, "group", f"{measure} (1/h)" if measure == LOSS else measure)


def _mean(axes: Axes, at: float, one: Estimate) -> None:
    if one.value is None:
        return
    if one.low is not None and one.high is not None:
        axes.plot([at, at], [one.low, one.high], color=BLUE)
    axes.plot([at], [one.value], MARKS[3], color=BLUE)


def draw_survival(axes: Axes, lives: Lives) -> Axes:
    """Share not yet retired against hours; a tick for each one still in use; 95 % limits of up to three groups."""
    import numpy as np

    from electrolog.judge.survival import survival

    largest = sorted(lives, key=lambda name: -len(np.asarray(lives[name][0])))[:MOST_CURVES]
    for place, name in enumerate(sorted(largest)):
        times, ended = (np.asarray(part) for part in lives[name])
        curve = survival(times, ended)
        ink, style = _INKS[place % len(_INKS)], LINES[place % len(LINES)]
        along, alive = np.r_[0.0, curve.time], np.r_[1.0, curve.alive]
        axes.step(along, alive, where="post", color=ink, linestyle=style, label=f"{_short(name)} ({len(times)})")
        if len(largest) <= 3:
            low, high = np.r_[1.0, curve.low], np.r_[1.0, curve.high]
            for edge in (low, high):
                axes.step(along, edge, where="post", color=ink, linestyle=style, linewidth=0.6, alpha=0.7)
        waiting = times[~ended.astype(bool)]
        axes.plot(waiting, [curve.at(float(one)) for one in waiting], "|", color=ink, markersize=7)
    axes.set_ylim(0.0, 1.05)
    axes.set_xlim(left=0.0)
    legend_beside(axes)
    left_out = len(lives) - len(largest)
    thin = "; thin: 95 %" if len(largest) <= 3 else ""
    more = f"; {left_out} smaller groups not drawn" if left_out else ""
    title = f"Not yet retired; | still in use{thin}{more}"
    return labelled(axes, title, "exposure (h, worth as in vivo)", "share of probes")


def _short(name: str) -> str:
    return name if len(name) <= 24 else name[:23] + "…"
