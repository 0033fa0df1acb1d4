"""Up to which concentration the calibration is still linear within a stated share."""

from __future__ import annotations

from electrolog.measure.line import LineFit, levels_um

LINEAR_SHARE = 0.05  # common practice: 5 % off the line is where linear ends


def linear_to_um(fit: LineFit, share: float = LINEAR_SHARE) -> float | None:
    """The highest concentration whose mean current lies within `share` of the line's response to it.

    The response is slope · concentration: the intercept is no part of it. None where two concentrations make
    any line straight, where the slope isn't positive, or where no concentration qualifies.
    """
    levels = levels_um(fit.concentration_um)
    if fit.degrees_of_freedom < 1 or len(levels) < 3 or fit.slope_na_um <= 0:
        return None
    for level_um in levels[levels > 0][::-1]:
        here = fit.concentration_um == level_um
        off_na = abs(float(fit.weights[here] @ fit.residual_na[here]) / float(fit.weights[here].sum()))
        if off_na <= share * fit.slope_na_um * level_um:
            return float(level_um)
    return None
