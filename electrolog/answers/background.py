"""The background current of a run, where this lab's own record says that it tells of the sensitivity."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from electrolog.answers import figures as made
from electrolog.answers.cohorts import Cohort
from electrolog.answers.fits import Assay
from electrolog.answers.hindsight import History, Target, before, targets_of
from electrolog.errors import InputError
from electrolog.fouling.background import Pairs, Trial, tried
from electrolog.fouling.fit import CohortFit
from electrolog.fouling.forecast import posterior
from electrolog.fouling.next_reading import reading_sd
from electrolog.record import queries
from electrolog.record.store import Record

Floats = NDArray[np.float64]


@dataclass(frozen=True)
class Background:
    """The charging current at one potential of the waveform, at the recording's start and at its end."""

    start_na: float
    end_na: float

    def __post_init__(self) -> None:
        if not (self.start_na > 0 and self.end_na > 0):
            raise InputError(
                f"background: {self.start_na:g} and {self.end_na:g} nA; accepted: two currents above zero, at the"
                " recording's start and at its end"
            )

    @property
    def log_change(self) -> float:
        return math.log(self.end_na / self.start_na)


def trial(record: Record, assay: Assay, fit: CohortFit) -> Trial:
    """What the cohort's own pairs of calibrations with a background say of it: each forecast from what came before it.

    The kept fit is used throughout: a probe's own contribution to it is taken out of its own forecasts.
    """
    with record.reading() as connection:
        probes, life = queries.probes(connection), queries.events(connection)
        found = queries.calibrations(connection, None, assay.analyte_id)
    history = History(assay.analyte, probes, life, made.all_figures(record, found))
    cohort = history.known()
    every = [target for target in targets_of(cohort) if target.waveform == assay.waveform]
    return tried(_pairs([target for target in every if all(_background(target))], history, cohort, fit))


def _background(target: Target) -> tuple[float, float]:
    """At the calibration before and at the target; 0 where it wasn't noted."""
    return target.earlier[-1].row["background_na"] or 0.0, target.event.row["background_na"] or 0.0


def _pairs(targets: Sequence[Target], history: History, cohort: Cohort, fit: CohortFit) -> Pairs:
    if not targets:
        nothing = np.zeros(0)
        return Pairs(np.zeros((0, 1)), nothing, nothing, np.zeros(1), nothing, np.zeros(0, dtype=np.int64))
    known = before(targets, history)
    drawn = posterior(fit, known.events)
    own = known.targets.own_reading
    last = np.array([len(target.earlier) - 1 for target in targets])
    at_last = drawn.log_sensitivity_at_reading(last)
    at_target = drawn.log_sensitivity(np.zeros((len(targets), len(known.events.settings))))
    probes = {label: k for k, label in enumerate(sorted({target.electrode for target in targets}))}
    return Pairs(
        forecast=at_target - at_last,
        reading=known.reading - own[:, -1],
        smoothed=_smoothed(targets, cohort, fit),
        reading_sd=reading_sd(fit, drawn),
        background=np.array([math.log(after / earlier) for earlier, after in map(_background, targets)]),
        probe=np.array([probes[target.electrode] for target in targets], dtype=np.int64),
    )


def _smoothed(targets: Sequence[Target], cohort: Cohort, fit: CohortFit) -> Floats:
    """(N,) expected true change from the reading before to the target, every reading of the cohort known."""
    units = np.array([cohort.place((target.electrode, target.waveform)) for target in targets])
    place = np.array([len(target.earlier) for target in targets])
    drawn = posterior(fit, cohort.events).only(units)
    change = drawn.log_sensitivity_at_reading(place) - drawn.log_sensitivity_at_reading(place - 1)
    return np.asarray(change.mean(axis=1))
