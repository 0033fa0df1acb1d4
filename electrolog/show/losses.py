"""What is left of a typical probe, in the terminal: a chart per kind, or the same as sentences."""

from __future__ import annotations

from collections.abc import Mapping, Sequence

from electrolog.fouling.typical import Floats, TypicalLoss
from electrolog.judge.words import shown_share
from electrolog.show import tables
from electrolog.show.terminal import Chart, Drawing
from electrolog.show.text import safe
from electrolog.units import shown_number

MOST_CHARTS = 3
LEAST_WEIGHT = 0.01
_SIGNS = "*+x#%@"


def answer(losses: Sequence[TypicalLoss], weights: Mapping[str, float], how: Drawing) -> None:
    """The kinds in the fit's order; a chart has a sign for each shape of loss that has weight."""
    shown = [name for name, weight in weights.items() if weight >= LEAST_WEIGHT]
    for loss in losses[:MOST_CHARTS] if how is Drawing.CHART else losses:
        tables.print_lines("", f"share left of a typical probe, {_kind(loss)}")
        if how is Drawing.CHART:
            _print_chart(loss, shown)
        else:
            tables.print_lines(*_sentences(loss))
    if how is Drawing.CHART and len(losses) > MOST_CHARTS:
        tables.print_lines(f"({len(losses) - MOST_CHARTS} more kinds are not drawn; --plain tells of all)")


def _kind(loss: TypicalLoss) -> str:
    return f"{'bare' if loss.coating == 'none' else f'coated with {loss.coating}'}, {loss.waveform}"


def _print_chart(loss: TypicalLoss, shapes: Sequence[str]) -> None:
    hours = loss.hours.tolist()
    chart = Chart("hours in vivo", "% left", x=(0.0, hours[-1]), y=(0.0, 105.0))
    chart.band(hours, _percent(loss.low), _percent(loss.high))
    every = max(1, len(hours) // 16)
    known = [(sign, name) for sign, name in zip(_SIGNS, shapes, strict=False) if name in loss.by_shape]
    for place, (sign, name) in reversed(list(enumerate(known))):
        # Each begins elsewhere, so that shapes that agree don't hide each other.
        part = slice(place % every, None, every)
        chart.points(hours[part], _percent(loss.by_shape[name])[part], sign)
    print(safe("\n".join(chart.text())))  # noqa: T201
    named = "; ".join(f"{sign} {name}" for sign, name in known)
    tables.print_lines(f"{named}; shaded: 90 % band over all shapes")


def _percent(share: Floats) -> list[float]:
    return [100.0 * float(one) for one in share]


def _sentences(loss: TypicalLoss) -> list[str]:
    places = range(0, len(loss.hours), max(1, len(loss.hours) // 6))
    return [
        f"after {shown_number(float(loss.hours[k]))} h in vivo: {shown_share(float(loss.median[k]))} left"
        f" (90 % interval {shown_share(float(loss.low[k]))} to {shown_share(float(loss.high[k]))})"
        for k in places
        if k
    ]
