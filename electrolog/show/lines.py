"""A calibration in the terminal: its points, the line and what the line leaves over; or the same in sentences."""

from __future__ import annotations

from collections.abc import Sequence

from electrolog.answers.history import Reading
from electrolog.show.line_figure import fitted_curve
from electrolog.show.tables import print_lines
from electrolog.show.terminal import Chart, Drawing
from electrolog.show.text import safe
from electrolog.units import counted, shown_concentration, shown_number

MOST_CHARTS = 3
_LOW = 11  # rows of what is left over: odd, so that zero has a row of its own
_STEPS = 120


def answer(readings: Sequence[Reading], how: Drawing) -> None:
    """Nothing where nobody looks; charts of the newest few, since more would scroll away."""
    with_points = [one for one in readings if one.points]
    if how is Drawing.PLAIN:
        for one in with_points:
            print_lines(f"{one.calibration}, point by point", *_sentences(one))
    if how is not Drawing.CHART:
        return
    for one in with_points[-MOST_CHARTS:]:
        _print_charts(one)
    if len(with_points) > MOST_CHARTS:
        more = counted(len(with_points) - MOST_CHARTS, "earlier one")
        print_lines(f"({more} not drawn: --figure draws up to 30)")


def _left_over(one: Reading) -> list[float] | None:
    """Current (nA) less what the curve gives there; None where there is no curve."""
    fitted = fitted_curve(one.points, one.figures, [x for x, _ in one.points])
    return None if fitted is None else [y - at for (_, y), at in zip(one.points, fitted, strict=True)]


def _print_charts(one: Reading) -> None:
    x, y = [at for at, _ in one.points], [current for _, current in one.points]
    wide, left = (min(0.0, *x), max(x)), _left_over(one)
    grid = [wide[0] + (wide[1] - wide[0]) * k / _STEPS for k in range(_STEPS + 1)]
    curve = fitted_curve(one.points, one.figures, grid) or []
    chart = Chart("concentration (µM)", "nA", x=wide, y=(min(0.0, *y), 1.05 * max(*y, *curve[-1:], 0.0)))
    if one.figures.lod_um is not None and one.figures.lod_um <= wide[1]:
        chart.interval(one.figures.lod_um, 0.0, max(y), ":")
    chart.points(grid[: len(curve)], curve, "·")
    chart.points(x, y, "o")
    suspect = one.figures.suspect_point
    if suspect is not None:
        chart.points([x[suspect]], [y[suspect]], "X")
    print_lines(f"{one.calibration}  {one.electrode}: points and line")
    print(safe("\n".join(chart.text())))  # noqa: T201
    if left is not None:
        _print_left_over(x, left, wide)
    print_lines(*_legend(one, left), "")


def _print_left_over(x: Sequence[float], left: Sequence[float], wide: tuple[float, float]) -> None:
    most = 1.1 * max(map(abs, left)) or 1.0
    chart = Chart("concentration (µM)", "left over (nA)", x=wide, y=(-most, most), rows=_LOW)
    chart.level(0.0)
    chart.points(x, left, "o")
    print(safe("\n".join(chart.text())))  # noqa: T201


def _legend(one: Reading, left: Sequence[float] | None) -> list[str]:
    said = [f"o {counted(len(one.points), 'point')}"]
    said += [] if left is None else ["· line" if one.figures.shape != "saturating" else "· isotherm"]
    if one.figures.lod_um is not None and one.figures.lod_um <= max(x for x, _ in one.points):
        said.append(f": detection limit {shown_concentration(one.figures.lod_um)}")
    said += [] if one.figures.suspect_point is None else ["X suspect, kept"]
    return ["; ".join(said)]


def _sentences(one: Reading) -> list[str]:
    left: Sequence[float | None] = _left_over(one) or [None] * len(one.points)
    said = []
    for place, ((x, y), over) in enumerate(zip(one.points, left, strict=True)):
        line = f"  {shown_concentration(x)}: {shown_number(y)} nA"
        if over is not None:
            line += f", {shown_number(abs(over), 2)} nA {'above' if over >= 0 else 'below'} the line"
        said.append(line + (", suspect and kept" if place == one.figures.suspect_point else ""))
    return said
