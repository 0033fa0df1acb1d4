"""The slow drift of a recording at rest, and the noise about it."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.polynomial import Polynomial
from numpy.typing import NDArray

from electrolog.errors import DataError
from electrolog.measure.recording import Span

Array = NDArray[np.float64]
FEWEST_AT_REST = 5


@dataclass(frozen=True)
class Drift:
    """`at_rest`: the stretches it was taken from. `noise_na`: standard deviation of single samples about them."""

    polynomial: Polynomial
    at_rest: tuple[Span, ...]
    noise_na: float

    def at(self, time_s: Array) -> Array:
        return np.asarray(self.polynomial(time_s))


def fitted_drift(time_s: Array, current_na: Array, injections: Sequence[Span], degree: int) -> Drift:
    """A polynomial by least squares through the stretches at rest; of lower degree where they are fewer."""
    rest = stretches_at_rest(time_s, injections)
    parts = [(time_s[here], current_na[here]) for here in (span.within(time_s) for span in rest)]
    if not parts:
        raise DataError(
            "no stretch at rest before, between or after the injections: the drift can't be taken off",
            "record a minute of buffer before the first injection, or give the injections as a table",
        )
    time, current = (np.concatenate(column) for column in zip(*parts, strict=True))
    fitted = Polynomial.fit(*_thinned(time, current), deg=min(degree, len(parts)))
    return Drift(fitted, rest, pooled_scatter([(t, c - fitted(t)) for t, c in parts]))


def stretches_at_rest(time_s: Array, injections: Sequence[Span]) -> tuple[Span, ...]:
    """All before the first injection, and the latter half of each pause: by then the tail is over."""
    ends = [float(time_s[0]), *[one.end_s for one in injections]]
    begins = [*[one.start_s for one in injections], float(time_s[-1])]
    stretches = [
        Span(begin - (begin - end) * (1.0 if place == 0 else 0.5), begin)
        for place, (end, begin) in enumerate(zip(ends, begins, strict=True))
        if begin > end
    ]
    return tuple(span for span in stretches if span.within(time_s).sum() >= FEWEST_AT_REST)


def scatter_about_line(time_s: Array, current_na: Array) -> float:
    """Standard deviation about a straight line of its own, so that what is left of a drift isn't taken for noise."""
    return pooled_scatter([(time_s, current_na)])


def pooled_scatter(parts: Sequence[tuple[Array, Array]]) -> float:
    squares, freedom = 0.0, 0
    for time, current in parts:
        clock = time - time.mean()
        off = current - current.mean()
        off = off - clock * (float(clock @ off) / max(float(clock @ clock), 1e-300))
        squares, freedom = squares + float(off @ off), freedom + max(0, len(time) - 2)
    return float((squares / freedom) ** 0.5) if freedom else 0.0


def _thinned(time: Array, current: Array, most: int = 20_000) -> tuple[Array, Array]:
    """Means of neighbours: the polynomial doesn't change, and millions of samples don't make it slow."""
    size = max(1, len(time) // most)
    whole = len(time) // size * size
    return time[:whole].reshape(-1, size).mean(1), current[:whole].reshape(-1, size).mean(1)
