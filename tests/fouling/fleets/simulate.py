"""Fleets of known truth: what a lab would have seen of its probes, and what was so."""

from __future__ import annotations

import datetime
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from electrolog.fouling.events import EXPOSURE, READING, RENEWAL, Events
from tests.fouling.fleets.families import generator, stream
from tests.fouling.fleets.generator import LN10, Array, Gaussian, Generator

AHEAD_H = 4.0
RETIRED_BELOW = float(np.log(5))
FIRST_DAY = datetime.date(2024, 1, 1)


@dataclass(frozen=True)
class State:
    """After each row, counted within its unit: the fouling clock, the log area change, the runs so far."""

    clock_h: Array
    log_area: Array
    runs: NDArray[np.int64]


@dataclass(frozen=True)
class Units:
    """What was drawn for each unit; the means are those of its own coating and batch."""

    level_mean: Array
    log_half_life_mean: Array
    level: Array
    log_half_life: Array
    log_exponent: Array
    first_step: Array
    damage: Array
    damaged_at_run: NDArray[np.int64]  # 1 is the first; 0: never
    broken: NDArray[np.bool_]


@dataclass(frozen=True)
class Truth:
    generator: Generator
    units: Units
    day_effect: Array  # per day
    error_sd: Array  # per row, NaN where no reading
    slip: Array  # per row
    log_sensitivity_now: Array  # per unit, at the end of its events
    log_sensitivity_ahead: Array  # per unit, after AHEAD_H more hours in vivo
    scored: NDArray[np.bool_]  # has a reading and isn't broken


@dataclass(frozen=True)
class Fleet:
    events: Events
    truth: Truth


@dataclass
class _Life:
    """One unit's rows as they are made."""

    kind: list[int]
    which: list[int]
    amount: list[float]

    def add(self, kind: int, which: int, amount: float) -> None:
        self.kind.append(kind)
        self.which.append(which)
        self.amount.append(amount)


def fleet(family: str, seed: int, n_units: int = 300) -> Fleet:
    return draw(generator(family, seed, n_units), seed)


def draw(gen: Generator, seed: int) -> Fleet:
    rng = stream("fleet", gen.family, seed)
    events = _skeleton(gen, rng)
    units = _units(gen, events, rng)
    measured = _measure(gen, events, units, rng)
    kept, broken = _lived(gen, measured.events, units, rng)
    return _cut(measured, kept, broken)


def walk(gen: Generator, events: Events) -> State:
    n_rows = events.unit.size
    clock_h, log_area, runs = np.zeros(n_rows), np.zeros(n_rows), np.zeros(n_rows, np.int64)
    for row in range(n_rows):
        if row and events.unit[row] == events.unit[row - 1]:
            clock_h[row], log_area[row], runs[row] = clock_h[row - 1], log_area[row - 1], runs[row - 1]
        if events.kind[row] == EXPOSURE:
            clock_h[row] += gen.setting_weights[events.which[row]] * events.amount[row]
            runs[row] += 1
        elif events.kind[row] == RENEWAL:
            clock_h[row] *= 1 - gen.renewals[events.which[row]].recovery
            log_area[row] += events.amount[row]
    return State(clock_h, log_area, runs)


def last_rows(events: Events) -> NDArray[np.int64]:
    return np.searchsorted(events.unit, np.arange(len(events.units)), side="right") - 1


def _skeleton(gen: Generator, rng: np.random.Generator) -> Events:
    """Everything but what is read; of a reading `which` is its date, counted from the lab's first day."""
    n_days = max(3, round(gen.n_units * float(np.mean(gen.reading_counts)) / gen.readings_per_day))
    lives = [_life(gen, n_days, rng) for _ in range(gen.n_units)]
    batch = np.arange(gen.n_units) // gen.batch_size
    coating = rng.integers(len(gen.coatings), size=batch[-1] + 1)[batch]
    kind = np.concatenate([life.kind for life in lives])
    return Events(
        unit=np.repeat(np.arange(gen.n_units), [len(life.kind) for life in lives]),
        kind=kind.astype(np.int8),
        which=np.concatenate([life.which for life in lives]),
        amount=np.concatenate([life.amount for life in lives]),
        se=np.full(kind.size, np.nan),
        units=tuple(f"P{u:04d}" for u in range(gen.n_units)),
        settings=gen.settings,
        renewals=tuple(r.name for r in gen.renewals),
        days=tuple((FIRST_DAY + datetime.timedelta(days=d)).isoformat() for d in range(n_days)),
        groups={
            "coating": tuple(gen.coatings[c] for c in coating),
            "batch": tuple(f"B{b:03d}" for b in batch),
        },
    )


def _life(gen: Generator, n_days: int, rng: np.random.Generator) -> _Life:
    life = _Life([], [], [])
    n_readings = int(rng.choice(gen.reading_counts))
    # before and after a run on one day, or days apart
    gaps = np.where(rng.random(n_readings) < 0.2, 0, rng.geometric(1 / gen.days_between, n_readings))
    date = int(rng.integers(max(1, n_days - gaps[1:].sum())))
    if rng.random() < 0.1:
        _run(life, gen, rng)
    for k in range(n_readings):
        if k:
            date = min(date + int(gaps[k]), n_days - 1)
            for _ in range(1 + (rng.random() < 0.25)):
                _run(life, gen, rng)
            _maybe_renew(life, gen, rng)
        life.add(READING, date, 0.0)
        _maybe_renew(life, gen, rng)
    if rng.random() < 0.3:
        _run(life, gen, rng)
    return life


def _run(life: _Life, gen: Generator, rng: np.random.Generator) -> None:
    setting = int(rng.choice(len(gen.settings), p=gen.setting_shares))
    life.add(EXPOSURE, setting, float(rng.uniform(0.5, 6.0)))


def _maybe_renew(life: _Life, gen: Generator, rng: np.random.Generator) -> None:
    if rng.random() >= gen.renewal_share:
        return
    which = int(rng.choice(len(gen.renewals), p=[r.share for r in gen.renewals]))
    area = gen.renewals[which]
    life.add(RENEWAL, which, float(rng.normal(area.log_area_mean, area.log_area_sd)))


def _units(gen: Generator, events: Events, rng: np.random.Generator) -> Units:
    n = gen.n_units
    coating = np.array([gen.coatings.index(c) for c in events.groups["coating"]])
    batch = np.unique(events.groups["batch"], return_inverse=True)[1]
    of_batch = rng.standard_normal((2, batch.max() + 1))[:, batch]
    level_mean = gen.level.mean + np.array(gen.coating_level)[coating] + gen.batch_level_sd * of_batch[0]
    rate_mean = gen.log_half_life.mean + np.array(gen.coating_log_half_life)[coating]
    rate_mean = rate_mean + gen.batch_log_half_life_sd * of_batch[1]
    n_runs = np.bincount(events.unit[events.kind == EXPOSURE], minlength=n)
    damaged = (rng.random(n) < gen.damage_share) & (n_runs > 0)
    exponent = Gaussian(gen.shape.log_exponent_mean, gen.shape.log_exponent_sd)
    return Units(
        level_mean=level_mean,
        log_half_life_mean=rate_mean,
        level=level_mean + gen.level.sd * rng.standard_normal(n),
        log_half_life=rate_mean + gen.log_half_life.sd * rng.standard_normal(n),
        log_exponent=exponent.mean + exponent.sd * rng.standard_normal(n),
        first_step=gen.first_step.mean + gen.first_step.sd * rng.standard_normal(n),
        damage=gen.damage.mean + gen.damage.sd * rng.standard_normal(n),
        damaged_at_run=np.where(damaged, 1 + rng.integers(np.maximum(n_runs, 1)), 0),
        broken=np.zeros(n, np.bool_),
    )


def _measure(gen: Generator, events: Events, units: Units, rng: np.random.Generator) -> Fleet:
    reading = events.kind == READING
    line_sd = np.where(reading, rng.uniform(0.015, 0.035, reading.size), np.nan)
    error_sd = np.hypot(line_sd, gen.repeat_sd)
    bad = rng.random(len(events.days)) < gen.bad_day_share
    day_effect = np.where(bad, gen.bad_day_sd, gen.day_sd) * rng.standard_normal(bad.size)
    slip = _slips(gen, events, rng)
    state = walk(gen, events)
    y = _log_sensitivity(gen, units, events.unit, state) + slip + error_sd * rng.standard_normal(reading.size)
    y[reading] += day_effect[events.which[reading]]
    # five points make a line: its error is known to three degrees of freedom, and not always written down
    se = line_sd * np.sqrt(rng.chisquare(3, reading.size) / 3)
    se[rng.random(reading.size) < 0.1] = np.nan
    seen = replace(events, amount=np.where(reading, y, events.amount), se=se)
    return Fleet(seen, _truth(gen, seen, units, day_effect, error_sd, slip))


def _truth(gen: Generator, events: Events, units: Units, day_effect: Array, error_sd: Array, slip: Array) -> Truth:
    state, last = walk(gen, events), last_rows(events)
    now = State(state.clock_h[last], state.log_area[last], state.runs[last])
    ahead = State(now.clock_h + AHEAD_H, now.log_area, np.maximum(now.runs, 1))
    every = np.arange(gen.n_units)
    n_readings = np.bincount(events.unit[events.kind == READING], minlength=gen.n_units)
    return Truth(
        generator=gen,
        units=units,
        day_effect=day_effect,
        error_sd=error_sd,
        slip=slip,
        log_sensitivity_now=_log_sensitivity(gen, units, every, now),
        log_sensitivity_ahead=_log_sensitivity(gen, units, every, ahead),
        scored=(n_readings > 0) & ~units.broken,
    )


def _lived(
    gen: Generator, events: Events, units: Units, rng: np.random.Generator
) -> tuple[NDArray[np.bool_], NDArray[np.bool_]]:
    """Rows that came to be, and units that broke: the more a probe has lost the likelier a run breaks it.

    A probe that reads less than a fifth of its first reading is retired. That choice rests on what was seen
    alone, so it tells the oracle nothing more.
    """
    loss = gen.shape.loss(walk(gen, events).clock_h, units.log_half_life[events.unit], units.log_exponent[events.unit])
    breaks = (events.kind == EXPOSURE) & (np.log(rng.random(loss.size)) > gen.log_survival(loss))
    reading = np.flatnonzero(events.kind == READING)
    first = reading[np.searchsorted(events.unit[reading], events.unit)]
    retires = (events.kind == READING) & (events.amount < events.amount[first] - RETIRED_BELOW)
    ends = breaks | retires
    before = np.cumsum(ends) - ends
    kept = before == before[np.searchsorted(events.unit, events.unit)]
    return kept, np.bincount(events.unit[breaks & kept], minlength=gen.n_units) > 0


def _cut(measured: Fleet, kept: NDArray[np.bool_], broken: NDArray[np.bool_]) -> Fleet:
    """The rows that are kept, and the days on which something was still read."""
    events, truth = measured.events, measured.truth
    reading = events.kind[kept] == READING
    which = events.which[kept]
    used, which[reading] = np.unique(which[reading], return_inverse=True)
    seen = replace(
        events,
        unit=events.unit[kept],
        kind=events.kind[kept],
        which=which,
        amount=events.amount[kept],
        se=events.se[kept],
        days=tuple(events.days[d] for d in used),
    )
    units = replace(truth.units, broken=broken)
    by_row = (truth.error_sd[kept], truth.slip[kept])
    return Fleet(seen, _truth(truth.generator, seen, units, truth.day_effect[used], *by_row))


def _log_sensitivity(gen: Generator, units: Units, unit: NDArray[np.int64], state: State) -> Array:
    loss = gen.shape.loss(state.clock_h, units.log_half_life[unit], units.log_exponent[unit])
    damaged = (units.damaged_at_run[unit] > 0) & (state.runs >= units.damaged_at_run[unit])
    stepped = units.first_step[unit] * (state.runs > 0)
    return np.asarray(units.level[unit] - loss - stepped - units.damage[unit] * damaged + state.log_area, np.float64)


def _slips(gen: Generator, events: Events, rng: np.random.Generator) -> Array:
    """Tenfold slips, at most two a unit so that the oracle can go through every case."""
    reading = events.kind == READING
    slipped = reading & (rng.random(reading.size) < gen.slip_share)
    while np.any(many := np.bincount(events.unit[slipped], minlength=gen.n_units) > 2):
        again = many[events.unit]
        slipped[again] = reading[again] & (rng.random(again.sum()) < gen.slip_share)
    return np.where(slipped, LN10 * rng.choice([-1, 1], reading.size), 0.0)
