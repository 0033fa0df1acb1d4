"""The backtest's part of a lab's report: were intervals as wide as they said, and where did the readings fall?"""

from __future__ import annotations

import math
from typing import Any

from electrolog.answers.backtesting import Backtest
from electrolog.answers.kept_backtest import KeptBacktest
from electrolog.clock import shown_moment
from electrolog.judge.backtest import PIT_CLASSES, Scored
from electrolog.show.backtests import cuts_said, verdicts_said
from electrolog.show.svg import Plot
from electrolog.units import counted, shown_number, shown_percent

LOOKS = ("curve", "rival dash", "rival dotted", "rival dashdot", "rival longdash")
TENTHS = tuple(k / 10 for k in range(1, 10))
_STEPS = 50
_CHANCE_SDS = 1.96  # 95 % of a binomial share, as good as normal


def tested_context(one: KeptBacktest, id_: str) -> dict[str, Any]:
    found = one.found
    said = [_said(one), *cuts_said(found), *verdicts_said(found), *found.notes]
    return {
        "analyte": found.analyte,
        "said": [text[:1].upper() + text[1:] for text in said],
        "scores": [_score(method) for method in found.methods],
        "reliability": reliability_chart(found),
        "reliability_id": f"{id_}r",
        "methods": [method.method for method in found.methods],
        "held": [_held(found, level) for level in TENTHS],
        "pit": pit_chart(found.methods[0]),
        "pit_id": f"{id_}p",
        "fell": [(_class(k), count) for k, count in enumerate(found.methods[0].pit_counts)],
    }


def _said(one: KeptBacktest) -> str:
    said = f"{len(one.found.forecasts)} calibrations, each forecast from what was known before it; made on "
    said += shown_moment(one.made_at)
    said += f"; since then {one.calibrations_since} more" if one.calibrations_since else ""
    return said + ("; entries were corrected since: run it again." if one.corrected_since else ".")


def _score(one: Scored) -> tuple[str, ...]:
    held = [f"{shown_percent(c.share)} [{shown_percent(c.low)} to {shown_percent(c.high)}]" for c in one.coverage]
    return (one.method, f"{one.crps:.3f}", f"{one.log_score:.2f}", *held, f"{one.coverage[-1].mean_width:.2f}")


def _held(found: Backtest, level: float) -> tuple[str, ...]:
    return (shown_percent(level), *[shown_percent(share_inside(method, level)) for method in found.methods])


def _class(k: int) -> str:
    return f"{k / PIT_CLASSES:.1f} to {(k + 1) / PIT_CLASSES:.1f}"


def share_inside(one: Scored, level: float) -> float:
    """Of the readings, those that lie in the central interval of that level of their forecasts."""
    return sum(2 * abs(float(at) - 0.5) <= level for at in one.pit) / max(len(one.pit), 1)


def reliability_chart(found: Backtest) -> Plot:
    plot = Plot("Reliability", "level of the interval (%)", "% of readings inside", (0, 100), (0, 100), 420.0, 300.0)
    levels = [k / _STEPS for k in range(_STEPS + 1)]
    chance = [_CHANCE_SDS * math.sqrt(p * (1 - p) / max(len(found.methods[0].pit), 1)) for p in levels]
    along = [100 * p for p in levels]
    low = [100 * (p - off) for p, off in zip(levels, chance, strict=True)]
    plot.band(along, low, [100 * (p + off) for p, off in zip(levels, chance, strict=True)], "chance")
    plot.line([0, 100], [0, 100], "zero")
    for look, one in reversed(list(zip(LOOKS, found.methods, strict=False))):
        plot.line(along, [100 * share_inside(one, p) for p in levels], look)
    for cover in found.methods[0].coverage:
        share, least, most = map(shown_percent, (cover.share, cover.low, cover.high))
        said = f"{shown_percent(cover.level)} intervals held {share} of the readings ({least} to {most}, 95 %)"
        plot.dot(100 * cover.level, 100 * cover.share, "circle", "dot", said)
    for look, one in zip(LOOKS, found.methods, strict=False):
        plot.explain("line", look, one.method)
    plot.explain("band", "chance", "what chance may do to honest intervals, 95 %")
    return plot


def pit_chart(one: Scored) -> Plot:
    expected = sum(one.pit_counts) / PIT_CLASSES
    chance = _CHANCE_SDS * math.sqrt(expected * (1 - 1 / PIT_CLASSES))
    top = 1.1 * max(*one.pit_counts, expected + chance, 1)
    plot = Plot("Where readings fell", "quantile of the forecast", "readings", (0, 1), (0, top), 420.0, 300.0)
    plot.box((0, 1), (max(0.0, expected - chance), expected + chance), "chance")
    plot.level(expected, "zero", f"expected of honest forecasts: {shown_number(expected)} in each")
    for k, count in enumerate(one.pit_counts):
        ends = (k + 0.06) / PIT_CLASSES, (k + 0.94) / PIT_CLASSES
        plot.box(
            ends, (0, count), "column", f"{_class(k)}: {counted(count, 'reading')}, expected {shown_number(expected)}"
        )
    plot.explain("band", "column", one.method)
    plot.explain("band", "chance", "what chance may do to honest forecasts, 95 %")
    return plot
