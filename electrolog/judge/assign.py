"""Which probe for which of the week's runs, so that the odds that all of them succeed are the greatest.

Success odds multiply, so their logarithms add, and one round of runs that overlap in time is a linear assignment
problem (Kuhn 1955; solved by scipy). A probe used on Monday is older on Wednesday: rounds are solved in turn, each
exactly, given what the others have taken, and counting what its wear costs the probe's later runs, until no round
changes. With one use per probe one step alone is the optimum. With re-use that settles in a place where no single
round can do better, so it is shaken a few times (some probes give back their runs) and the best is kept: brute force
on small weeks seldom finds a better one.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from datetime import datetime, timedelta

import numpy as np
from numpy.typing import NDArray

from electrolog.errors import InputError
from electrolog.units import shown_percent

Array = NDArray[np.float64]
Taken = NDArray[np.int64]  # (R,) the probe of each run, -1: none

UNSERVED = 1e4  # dearer than any loss of odds: first as many runs as possible, then the best odds
IMPOSSIBLE = 1e7
MOST_SWEEPS = 8
MOST_SHAKES, SHAKEN_RUNS = 60, 300  # shakes, and runs solved again in all of them: a small week gets more shakes


@dataclass(frozen=True)
class PlannedRun:
    """kind names the success table that it is judged by: runs with the same analyte, waveform, setting and limits.

    wear_min: what it takes out of a probe, in the tables' minutes; None: its duration.
    """

    label: str
    start: datetime
    duration_min: float
    kind: str
    wear_min: float | None = None

    @property
    def wear(self) -> float:
        return self.duration_min if self.wear_min is None else self.wear_min

    @property
    def end(self) -> datetime:
        return self.start + timedelta(minutes=self.duration_min)


@dataclass(frozen=True)
class SuccessTable:
    """Odds that no limit is broken when each of P probes has worn that much from now on.

    wear_min: (G,) rising from 0; p_success: (P, G), NaN in the rows of probes that can't serve this kind.
    """

    wear_min: Array
    p_success: Array

    def at(self, probes: Taken, wear_min: Array) -> Array:
        """(N,) probes and minutes -> (N,) odds; NaN beyond the table, where nothing was computed."""
        grid = self.wear_min
        right = np.clip(np.searchsorted(grid, wear_min), 1, len(grid) - 1)
        share = (wear_min - grid[right - 1]) / (grid[right] - grid[right - 1])
        found = self.p_success[probes, right - 1] * (1 - share) + self.p_success[probes, right] * share
        return np.where(wear_min <= grid[-1], found, np.nan)


@dataclass(frozen=True)
class Week:
    """R runs and P probes. available: (R, P), whether the probe can be there at all (state, place, promised to others).

    uses_left: (P,) how many of these runs a probe may serve; turnaround_min: between two runs of the same probe
    (cleaning and the new calibration that a run makes necessary). Odds below least_success serve no run.
    """

    runs: Sequence[PlannedRun]
    tables: Mapping[str, SuccessTable]
    available: NDArray[np.bool_]
    uses_left: NDArray[np.int64]
    least_success: float
    turnaround_min: float = 0.0


@dataclass(frozen=True)
class Place:
    """probe: index, None when the run can't be served, and `why` says why. wear_before_min: from this week's runs."""

    run: PlannedRun
    probe: int | None
    p_success: float | None
    wear_before_min: float
    why: str


def assign(week: Week) -> tuple[Place, ...]:
    """A place per run, in the order given. Raises InputError for a run that isn't longer than zero or has no table."""
    _refuse(week)
    if not week.runs:
        return ()
    board = _Board(week)
    best = board.all_at_once()
    if (week.uses_left > 1).any():
        best = board.shaken(max(board.improved(best.copy()), board.improved(board.nobody()), key=board.score))
    return tuple(board.place(run, best) for run in range(len(week.runs)))


def _refuse(week: Week) -> None:
    for run in week.runs:
        if not run.duration_min > 0 or run.wear < 0:
            raise InputError(f"run '{run.label}' is {run.duration_min:g} min long; accepted: longer than zero")
        if run.kind not in week.tables:
            raise InputError(f"run '{run.label}' is of kind '{run.kind}', for which there is no success table")


class _Board:
    """The week with its conflicts worked out once."""

    def __init__(self, week: Week) -> None:
        self.week, self.runs = week, week.runs
        self.probes, count = week.available.shape[1], len(week.runs)
        self.wear = np.array([run.wear for run in self.runs])
        self.kind = np.array([run.kind for run in self.runs])
        gap = timedelta(minutes=week.turnaround_min)
        starts, ends = [run.start for run in self.runs], [run.end + gap for run in self.runs]
        self.clash = np.array(
            [[starts[a] < ends[b] and starts[b] < ends[a] for b in range(count)] for a in range(count)]
        )
        order = sorted(range(count), key=lambda run: (starts[run], run))
        self.rank = np.empty(count, dtype=int)
        self.rank[order] = np.arange(count)
        self.rounds = _rounds(order, starts, ends)

    def nobody(self) -> Taken:
        return np.full(len(self.runs), -1)

    def all_at_once(self) -> Taken:
        """The optimum when every probe serves one run at most."""
        return self._solved(np.arange(len(self.runs)), self.nobody())

    def improved(self, taken: Taken, order: Sequence[int] | None = None) -> Taken:
        for _ in range(MOST_SWEEPS):
            before = taken.copy()
            for index in range(len(self.rounds)) if order is None else order:
                members = self.rounds[index]
                taken[members] = -1
                taken[members] = self._solved(members, taken)
            if np.array_equal(before, taken):
                break
        return taken

    def shaken(self, best: Taken) -> Taken:
        rng = np.random.default_rng(0)  # fixed: the same week gets the same answer
        for _ in range(min(MOST_SHAKES, SHAKEN_RUNS // len(self.runs))):
            given_back = rng.random(self.probes + 1) < rng.random()
            start = np.where(given_back[best], -1, best)
            # In time order the first run takes what two later ones could have shared; another order gives them a turn.
            order = rng.permutation(len(self.rounds)).tolist()
            best = max(best, self.improved(start, order), key=self.score)
        return best

    def score(self, taken: Taken) -> tuple[int, float]:
        served = np.flatnonzero(taken >= 0)
        return len(served), float(np.log(self._odds_of(served, taken)).sum())

    def _solved(self, members: Taken, taken: Taken) -> Taken:
        from scipy.optimize import linear_sum_assignment

        costs = np.full((len(members), self.probes + len(members)), IMPOSSIBLE)
        for row, run in enumerate(members):
            costs[row, : self.probes] = self._costs(int(run), taken)
            costs[row, self.probes + row] = UNSERVED
        columns = linear_sum_assignment(costs)[1]
        return np.where(columns < self.probes, columns, -1)

    def _costs(self, run: int, taken: Taken) -> Array:
        """(P,) the loss of log odds if each probe took this run: the run's own, and that of the probe's later runs."""
        own = self._odds(run, taken)
        good = self._free(run, taken) & (own >= self.week.least_success) & (own > 0)
        costs = np.where(good, -np.log(np.where(good, own, 1.0)), IMPOSSIBLE)
        later = np.flatnonzero((taken >= 0) & (self.rank > self.rank[run]))
        np.add.at(costs, taken[later], self._cost_to(later, run, taken))
        return np.asarray(np.minimum(costs, IMPOSSIBLE))

    def _cost_to(self, later: Taken, run: int, taken: Taken) -> Array:
        """What each later run would lose if its own probe took this run before it."""
        now, after = self._odds_of(later, taken), self._odds_of(later, taken, self.wear[run])
        good = after >= self.week.least_success
        return np.where(good, np.log(now) - np.log(np.where(good, after, 1.0)), IMPOSSIBLE)

    def _free(self, run: int, taken: Taken) -> NDArray[np.bool_]:
        used = np.bincount(taken[taken >= 0], minlength=self.probes)
        free = np.asarray(self.week.available[run] & (used < self.week.uses_left), dtype=bool)
        clashing = taken[self.clash[run]]
        free[clashing[clashing >= 0]] = False
        return free

    def _odds(self, run: int, taken: Taken) -> Array:
        """(P,) odds that the run succeeds on each probe, worn by what it has served before."""
        worn = self._wear_before(run, taken) + self.wear[run]
        return self.week.tables[self.runs[run].kind].at(np.arange(self.probes), worn)

    def _wear_before(self, run: int, taken: Taken) -> Array:
        before = (taken >= 0) & (self.rank < self.rank[run])
        return np.bincount(taken[before], weights=self.wear[before], minlength=self.probes).astype(float)

    def _odds_of(self, served: Taken, taken: Taken, more_wear: float = 0.0) -> Array:
        """(N,) odds of those runs on the probes they have, each worn by so much more."""
        same = taken[served][:, None] == taken
        before = same & (self.rank <= self.rank[served][:, None])
        worn = before @ self.wear + more_wear
        odds = np.empty(len(served))
        for kind, table in self.week.tables.items():
            of_kind = self.kind[served] == kind
            odds[of_kind] = table.at(taken[served][of_kind], worn[of_kind])
        return odds

    def place(self, run: int, taken: Taken) -> Place:
        probe = int(taken[run])
        if probe < 0:
            return Place(self.runs[run], None, None, 0.0, self._why(run, taken))
        p_success = float(self._odds_of(np.array([run]), taken)[0])
        return Place(self.runs[run], probe, p_success, float(self._wear_before(run, taken)[probe]), "")

    def _why(self, run: int, taken: Taken) -> str:
        """What became of each probe, and the best of those that would be free."""
        own, there = self._odds(run, taken), self.week.available[run]
        able, free = there & ~np.isnan(own), self._free(run, taken)
        good = able & (own >= self.week.least_success)
        counts = {
            "not available then": int((~there).sum()),
            "without a usable forecast for this kind of run": int((there & ~able).sum()),
            "below the accepted odds": int((able & ~good).sum()),
            "taken by other runs": int((good & ~free).sum()),
            "needed more by its later run": int((good & free).sum()),
        }
        said = ", ".join(f"{count} {what}" for what, count in counts.items() if count)
        if not (able & free & ~good).any():
            return f"no probe: {said or 'there are none'}"
        best = float(own[able & free & ~good].max())
        return f"no probe: {said}; the best free one has odds of success {shown_percent(best)}"


def _rounds(order: list[int], starts: list[datetime], ends: list[datetime]) -> list[Taken]:
    """Runs that all overlap one another, in time order: of one round a probe can serve one run at most."""
    rounds: list[list[int]] = []
    first_end = None
    for run in order:
        if first_end is None or starts[run] >= first_end:
            rounds.append([])
            first_end = ends[run]
        rounds[-1].append(run)
        first_end = min(first_end, ends[run])
    return [np.array(members) for members in rounds]
