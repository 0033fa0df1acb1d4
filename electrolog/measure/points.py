"""What the points of one line tell about themselves: lack of fit, curvature, leverage, a suspect."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from electrolog.measure.line import LineFit, levels_um
from electrolog.measure.tails import f_p, two_sided_p

Array = NDArray[np.float64]


@dataclass(frozen=True)
class LackOfFit:
    """Replicates' pure error against the distance of their means from the line: weighted sums of squares."""

    pure_error_na2: float
    pure_error_freedom: int
    lack_of_fit_na2: float
    lack_of_fit_freedom: int

    @property
    def f(self) -> float:
        if not (self.testable and self.pure_error_na2 > 0):
            return math.nan
        mean_square = self.lack_of_fit_na2 / self.lack_of_fit_freedom
        return mean_square / (self.pure_error_na2 / self.pure_error_freedom)

    @property
    def testable(self) -> bool:
        return self.pure_error_freedom > 0 and self.lack_of_fit_freedom > 0

    @property
    def p(self) -> float:
        return f_p(self.f, self.lack_of_fit_freedom, self.pure_error_freedom)

    def significant(self, level: float = 0.05) -> bool:
        """False also where it can't be tested."""
        return self.p < level


def lack_of_fit(fit: LineFit) -> LackOfFit:
    levels = levels_um(fit.concentration_um)
    where = np.searchsorted(levels, fit.concentration_um)
    weight = np.bincount(where, fit.weights)
    mean_na = np.bincount(where, fit.weights * fit.current_na) / weight
    pure = float(fit.weights @ (fit.current_na - mean_na[where]) ** 2)
    lack = float(weight @ (mean_na - fit.current_at(levels)) ** 2)
    return LackOfFit(
        pure_error_na2=pure,
        pure_error_freedom=fit.n_points - len(levels),
        lack_of_fit_na2=lack,
        lack_of_fit_freedom=len(levels) - fit.n_points + fit.degrees_of_freedom,
    )


def p_against_zero(value: float, se: float, degrees_of_freedom: int) -> float:
    """The chance of a value at least so far from zero if it were zero. NaN: can't say."""
    if se == 0:
        return math.nan if value == 0 else 0.0
    return two_sided_p(value / se, degrees_of_freedom)


def tells_from_zero(value: float, se: float, degrees_of_freedom: int, level: float = 0.05) -> bool:
    """A value above zero that scatter alone wouldn't give, as far as the points can say."""
    return value > 0 and not p_against_zero(value, se, degrees_of_freedom) >= level


def leverage(fit: LineFit) -> Array:
    """Each point's pull on the line, 0 to 1: the diagonal of the hat matrix."""
    about_centre = (fit.concentration_um - fit.centre_um) ** 2 / fit.spread_um2
    return fit.weights * (about_centre + (0.0 if fit.through_zero else 1 / fit.n_points))


def studentised_residuals(fit: LineFit) -> Array:
    """Each residual over its standard error, both against the line through the other points.

    Externally studentised (Cook & Weisberg 1982, section 2.2.1): Student's t with one degree of freedom less.
    NaN where the others leave no degree of freedom, or where a point alone holds the line.
    """
    freedom = fit.degrees_of_freedom - 1
    rest = 1 - leverage(fit)
    squared = fit.weights * fit.residual_na**2
    with np.errstate(divide="ignore", invalid="ignore"):
        others = (float(squared.sum()) - squared / rest) / freedom if freedom > 0 else np.nan * squared
        t = np.sign(fit.residual_na) * np.sqrt(squared / (np.maximum(others, 0) * rest))
    return np.where(rest > 1e-9, t, np.nan)


@dataclass(frozen=True)
class SuspectPoint:
    index: int
    concentration_um: float
    current_na: float
    studentised_residual: float
    p: float


def suspect_point(fit: LineFit, level: float = 0.01) -> SuspectPoint | None:
    """The point farthest off the line through the others, if chance among n points won't explain it.

    Named, never dropped: `p` is corrected for the choice among n (Bonferroni).
    """
    t = studentised_residuals(fit)
    freedom = fit.degrees_of_freedom - 1
    if freedom < 2 or fit.exact() or not np.isfinite(t).any():  # three others fall in line by chance
        return None
    index = int(np.nanargmax(np.abs(np.where(np.isfinite(t), t, 0.0))))
    p = min(1.0, fit.n_points * two_sided_p(float(t[index]), freedom))
    if p >= level:
        return None
    x, y = fit.concentration_um[index], fit.current_na[index]
    return SuspectPoint(index, float(x), float(y), float(t[index]), p)


@dataclass(frozen=True)
class GrowingScatter:
    """The replicates' pooled standard deviations in the lower and in the upper half of the concentrations."""

    low_na: float
    high_na: float
    from_um: float
    p: float


def growing_scatter(fit: LineFit, level: float = 0.01) -> GrowingScatter | None:
    """Where weighted replicates scatter more above the middle concentration than below, by the F test; else None."""
    replicated = [u for u in levels_um(fit.concentration_um) if (fit.concentration_um == u).sum() > 1]
    if len(replicated) < 2:
        return None
    middle = len(replicated) // 2
    low_na2, low_freedom = _pooled(fit, replicated[:middle])
    high_na2, high_freedom = _pooled(fit, replicated[middle:])
    p = f_p(high_na2 / low_na2, high_freedom, low_freedom) if low_na2 > 0 else math.nan
    return GrowingScatter(low_na2**0.5, high_na2**0.5, replicated[middle], p) if p < level else None


def _pooled(fit: LineFit, levels: list[float]) -> tuple[float, int]:
    """Variance within the concentrations (weighted), and its degrees of freedom."""
    squares, freedom = 0.0, 0
    for here in (fit.concentration_um == level for level in levels):
        w, y = fit.weights[here], fit.current_na[here]
        squares += float(w @ (y - float(w @ y) / float(w.sum())) ** 2)
        freedom += len(y) - 1
    return squares / freedom, freedom


def curvature_p(fit: LineFit) -> float:
    """One-sided p of a bend downwards: the t test of a quadratic term added to the line. NaN: can't say."""
    freedom = fit.degrees_of_freedom - 1
    bend = _beyond_the_line(fit)
    if freedom < 1 or bend is None or fit.exact():
        return math.nan
    bend_na = float(fit.weights @ (bend * fit.residual_na))
    rest_na2 = float(fit.weights @ fit.residual_na**2) - bend_na**2
    t = bend_na / math.sqrt(max(rest_na2, 1e-300) / freedom)
    half = two_sided_p(t, freedom) / 2
    return half if t < 0 else 1 - half


def _beyond_the_line(fit: LineFit) -> Array | None:
    """c² without all that the line explains, of length one: the part of a bend that the line can't follow."""
    x, w = fit.concentration_um / np.abs(fit.concentration_um).max(), fit.weights
    centre = 0.0 if fit.through_zero else float(w @ x) / len(x)
    xc, bend = x - centre, x**2
    for _ in range(2):
        bend = bend - (0.0 if fit.through_zero else float(w @ bend) / len(x))
        bend = bend - xc * (float(w @ (xc * bend)) / float(w @ xc**2))
    length = math.sqrt(float(w @ bend**2))
    return bend / length if length > 1e-9 else None
