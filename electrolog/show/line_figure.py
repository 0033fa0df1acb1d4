"""Calibrations as pictures: points and what was made of them, what the line leaves over, and the detection limit."""

from __future__ import annotations

from collections.abc import Sequence
from pathlib import Path
from typing import TYPE_CHECKING

from electrolog.answers.history import Reading
from electrolog.errors import DataError, InputError
from electrolog.measure.calibrate import CalibrationFigures
from electrolog.show.figures import BLUE, BROWN, INK, MARKS, QUIET, figure, labelled
from electrolog.show.tables import with_error
from electrolog.units import counted, shown_concentration

if TYPE_CHECKING:
    from matplotlib.axes import Axes

Points = Sequence[tuple[float, float]]
MOST_LINES = 30


def draw_calibrations(path: Path, readings: Sequence[Reading]) -> None:
    """Logged calibrations beside each other, under each what its line leaves over."""
    drawn = [one for one in readings if one.points]
    if not drawn:
        raise InputError("figure: no points were kept, so that there is no line to draw")
    if len(drawn) > MOST_LINES:
        raise InputError(
            f"figure: {len(drawn)} calibrations are too many for one picture; accepted: up to {MOST_LINES}",
            "name fewer probes, or choose with --analyte and --waveform",
        )
    columns = min(3, len(drawn))
    rows = -(-len(drawn) // columns)
    with figure(path, 3.6 * columns + 0.6, 4.6 * rows) as paper:
        parts = paper.subfigures(rows, columns, squeeze=False).ravel().tolist()
        for part, one in zip(parts, drawn, strict=False):
            upper, lower = part.subplots(2, 1, sharex=True, height_ratios=(3, 1))
            draw_line(upper, one.points, one.figures).set_xlabel("")
            upper.set_title(f"{one.calibration}  {one.electrode}")
            draw_residuals(lower, one.points, one.figures).set_title("")


def draw_line(axes: Axes, points: Points, figures: CalibrationFigures) -> Axes:
    """The points and what was made of them; a suspect point is ringed."""
    concentrations, currents = zip(*points, strict=True)
    axes.plot(concentrations, currents, MARKS[0], color=INK, label=counted(len(points), "point"))
    if figures.suspect_point is not None:
        at = figures.suspect_point
        axes.plot(concentrations[at], currents[at], "o", ms=12, mfc="none", color=BROWN, label="suspect, kept")
    if figures.sensitivity_na_um is not None:
        _fitted(axes, points, figures, max(concentrations))
    if figures.lod_um is not None and figures.lod_um <= max(concentrations):
        label = f"detection limit {shown_concentration(figures.lod_um)}"
        axes.axvline(figures.lod_um, color=BROWN, linestyle=":", label=label)
    axes.legend(loc="best")
    return labelled(axes, "Calibration", "concentration (µM)", "current (nA)")


def draw_residuals(axes: Axes, points: Points, figures: CalibrationFigures) -> Axes:
    """Each current less what the fitted curve gives there."""
    import numpy as np

    along, currents = zip(*points, strict=True)
    fitted = fitted_curve(points, figures, along)
    axes.axhline(0.0, color=QUIET, linewidth=0.8)
    if fitted is None:
        axes.annotate("no line", (0.5, 0.6), xycoords="axes fraction", ha="center", color=QUIET, fontsize=8)
    else:
        left = np.asarray(currents) - fitted
        axes.vlines(along, 0.0, left, color=QUIET, linewidth=0.9)
        axes.plot(along, left, MARKS[0], color=INK, markersize=4)
        axes.margins(y=0.2)
    return labelled(axes, "Residuals", "concentration (µM)", "left over (nA)")


def _fitted(axes: Axes, points: Points, figures: CalibrationFigures, top: float) -> None:
    slope, offset = figures.sensitivity_na_um or 0.0, figures.intercept_na or 0.0
    label = f"{with_error(slope, figures.sensitivity_se_na_um)} nA/µM"
    if figures.shape != "saturating":
        axes.plot([0, top], [offset, offset + slope * top], color=BLUE, label=label, zorder=1)
        return
    # The slope at low concentration overshoots the points: it must not stretch the axis.
    until = min(top, (max(current for _, current in points) - offset) / slope) if slope > 0 else top
    axes.plot([0, until], [offset, offset + slope * until], color=BLUE, linestyle="--", label=label, zorder=1)
    grid = [top * k / 80 for k in range(81)]
    curve = fitted_curve(points, figures, grid)
    if curve is not None:
        axes.plot(grid, curve, color=BLUE, label="isotherm", zorder=1)


def fitted_curve(points: Points, figures: CalibrationFigures, at_um: Sequence[float]) -> list[float] | None:
    """Current (nA) of the fitted line or isotherm; None where nothing could be fitted."""
    from electrolog.measure.saturating import fit_saturating

    if figures.sensitivity_na_um is None:
        return None
    if figures.shape != "saturating":
        return [(figures.intercept_na or 0.0) + figures.sensitivity_na_um * x for x in at_um]
    try:
        fit = fit_saturating(*zip(*points, strict=True))
    except DataError:
        return None
    bound = [fit.affinity_per_um * x for x in at_um]
    return [fit.offset_na + fit.current_max_na * b / (1 + b) for b in bound]
