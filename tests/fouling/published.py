"""Published degradation as a fit sees it: a unit a specimen, an exposure between readings, a day for each reading."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from electrolog.fouling.cohort import fit_cohort
from electrolog.fouling.events import EXPOSURE, READING, Events
from electrolog.fouling.forecast import Posterior, posterior
from electrolog.fouling.parameters import read_scales
from tests.fouling.fleets.generator import Array

Path = tuple[Sequence[float], Sequence[float]]  # hours, log of what is left


def events_of(paths: Sequence[Path], factor: Sequence[str] | None = None) -> Events:
    rows: list[tuple[int, int, int, float]] = []
    n_days = 0
    for unit, (hours, log_left) in enumerate(paths):
        before = 0.0
        for at, y in zip(hours, log_left, strict=True):
            if at > before:
                rows.append((unit, EXPOSURE, 0, at - before))
            rows.append((unit, READING, n_days, y))
            before, n_days = at, n_days + 1
    unit, kind, which, amount = (np.array(column) for column in zip(*rows, strict=True))
    return Events(
        unit=unit,
        kind=kind.astype(np.int8),
        which=which,
        amount=amount.astype(np.float64),
        se=np.full(unit.size, np.nan),
        units=tuple(f"specimen {u + 1}" for u in range(len(paths))),
        settings=("in-vivo",),
        renewals=(),
        days=tuple(f"day {d:04d}" for d in range(n_days)),
        groups={} if factor is None else {"coating": tuple(factor)},
    )


def halves(path: Path, n_seen: int) -> tuple[Path, Path]:
    hours, log_left = path
    return (hours[:n_seen], log_left[:n_seen]), (hours[n_seen:], log_left[n_seen:])


class Forecast:
    """From what was seen of every specimen: what later readings of each will be."""

    def __init__(self, seen: Sequence[Path], factor: Sequence[str] | None = None) -> None:
        events = events_of(seen, factor)
        self.fit = fit_cohort(events)
        self.posterior: Posterior = posterior(self.fit, events)
        self.ends = np.array([hours[-1] for hours, _ in seen])

    def at(self, hours: float) -> Array:
        """Draws (U, D) of log of what is truly left."""
        return self.posterior.log_sensitivity((hours - self.ends)[:, None])

    def reading_at(self, hours: float) -> Array:
        """Draws (U, D) of a reading then: the truth, the reading's own error and its day's."""
        truth = self.at(hours)
        noise = np.random.default_rng(0).standard_normal(truth.shape)
        return truth + noise * self._reading_sd(truth.shape[1])

    def hours_to(self, log_left: float, horizon: Array) -> Array:
        """Draws (U, D) of the first of the horizon's hours at which no more than this is left; inf where none is."""
        below = np.stack([self.at(h) <= log_left for h in horizon])
        return np.where(below.any(axis=0), horizon[below.argmax(axis=0)], np.inf)

    def _reading_sd(self, n_draws: int) -> float:
        parts = [read_scales(part.layout, part.theta) for part in self.fit.components]
        variances = [float(s.residual_sd) ** 2 + float(s.day_sd) ** 2 for s in parts]
        return float(np.sqrt(np.average(variances, weights=[part.weight for part in self.fit.components])))
