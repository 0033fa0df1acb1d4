"""How long each probe will last, and how many to make for the runs that are planned."""

from __future__ import annotations

import statistics
from collections import Counter
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace
from datetime import datetime, timedelta

import numpy as np
from numpy.typing import NDArray

from electrolog.answers import life as lives
from electrolog.answers.answer import Answer
from electrolog.answers.asked import Asked, Floats, Run, ask
from electrolog.answers.checking import Demands, question_of, rules_of_the_lab
from electrolog.answers.cohorts import coating
from electrolog.answers.comparing import told, usable
from electrolog.answers.standing import unanswerable
from electrolog.clock import utc_now
from electrolog.errors import InputError
from electrolog.fouling.events import Events
from electrolog.fouling.forecast import posterior
from electrolog.judge.experiment import Recalibration, recalibrate_first
from electrolog.judge.facts import CalibrationFacts
from electrolog.judge.picture import look
from electrolog.judge.question import Question
from electrolog.judge.retirement import ToMake, breaking_times_min, life, probes_to_make, runs_within
from electrolog.record import queries, sheets
from electrolog.record.queries import Event
from electrolog.record.readable import Row
from electrolog.record.store import Record

RECENT = timedelta(days=30)
NOT_WORN_OUT = ("broken", "lost", "left in tissue", "seal failed")  # an end that no limit foresees
MOST_NAMED = 5
NEWEST = 20  # probes whose kind stands for those that will be made


@dataclass(frozen=True)
class Lasting:
    """Hours of run from now, in the run's setting. None: can't be told, or not within a thousand.

    accepted_h: when the odds of a breach pass the accepted risk, and `accepted_on` at the probe's pace of use.
    broken_h: the 5, 50 and 95 % quantiles of when the first limit really breaks.
    """

    electrode: str
    accepted_h: float | None
    broken_h: tuple[float | None, float | None, float | None]
    accepted_on: datetime | None
    why: str


@dataclass(frozen=True)
class Making:
    """What a month's runs will take. unproven: probes on the shelf, not yet calibrated; they count among those to make.

    new_probe: the kind that is reckoned with. p_lost_per_run: odds that a run ends a probe by breakage or loss.
    """

    planned_runs: int
    to_make: ToMake
    unproven: int
    new_probe: str
    p_lost_per_run: float


@dataclass(frozen=True)
class Outlook(Answer):
    """recalibrate_first: where a calibration now would save most, the best first.

    pace_h_per_day: run hours per day of a probe in use, over the last month; None: there was none.
    """

    probes: tuple[Lasting, ...]
    making: Making | None
    recalibrate_first: tuple[Recalibration, ...]
    pace_h_per_day: float | None
    notes: tuple[str, ...]


def outlook(
    record: Record,
    labels: Sequence[str] | None,
    run: Run,
    demands: Demands,
    planned_runs: int | None = None,
    moment: datetime | None = None,
) -> Outlook:
    """planned_runs: of the coming month; None: as many as in the last. Raises InputError for a negative number."""
    if planned_runs is not None and planned_runs < 0:
        raise InputError(f"{planned_runs} planned runs; accepted: none or more")
    moment = moment or utc_now()
    asked = ask(record, labels, run, moment)
    limits, standards = rules_of_the_lab(record, asked, demands)
    questions = [question_of(asked, place, run, limits, demands, standards) for place in range(len(asked.labels))]
    with record.reading() as connection:
        probes, everything = queries.probes(connection), queries.events(connection)
    story = {label: lives.until(events, moment) for label, events in everything.items()}
    pace = _pace(story, moment)
    found = [_lasting(asked, label, question, pace) for label, question in zip(asked.labels, questions, strict=True)]
    making = _making(asked, questions, probes, story, planned_runs) if labels is None else None
    first = _recalibrate_first(asked, questions)
    return Outlook(tuple(sorted(found, key=_soonest_first)), making, first, pace, asked.fit.notes)


def _recalibrate_first(asked: Asked, questions: Sequence[Question]) -> tuple[Recalibration, ...]:
    known = zip(asked.labels, questions, strict=True)
    seen = {label: look(question).outlook for label, question in known if not question.out_of_use}
    return recalibrate_first({label: one.value for label, one in seen.items() if one is not None})[:MOST_NAMED]


def _soonest_first(one: Lasting) -> tuple[bool, float, str]:
    return bool(one.why), np.inf if one.accepted_h is None else one.accepted_h, one.electrode


def _pace(story: Mapping[str, Sequence[Event]], moment: datetime) -> float | None:
    hours = [sum(lives.exposure_h(_lately(events, moment), moment).values()) for events in story.values()]
    used = [value for value in hours if value > 0]
    return sum(used) / len(used) / (RECENT / timedelta(days=1)) if used else None


def _lately(events: Sequence[Event], moment: datetime) -> list[Event]:
    return [event for event in events if event.at > moment - RECENT]


def _lasting(asked: Asked, label: str, question: Question, pace: float | None) -> Lasting:
    unknown = (None, None, None)
    reason = unanswerable(asked, label)
    if reason is not None or question.out_of_use:
        return Lasting(label, None, unknown, None, question.out_of_use or (reason.text if reason else ""))
    found = life(question) if question.calibration is not None else None
    if found is None:
        never = question.calibration is None
        why = f"never calibrated with {asked.assay.said}" if never else "a limit is unset or can't be told"
        return Lasting(label, None, unknown, None, why)
    accepted_h = _hours(found.accepted_min)
    on = None if accepted_h is None or not pace else asked.moment + timedelta(days=accepted_h / pace)
    low, middle, high = (_hours(minutes) for minutes in found.broken_min)
    return Lasting(label, accepted_h, (low, middle, high), on, "")


def _hours(minutes: float | None) -> float | None:
    return None if minutes is None else minutes / 60


def _making(
    asked: Asked,
    questions: Sequence[Question],
    probes: Sequence[Row],
    story: Mapping[str, list[Event]],
    planned_runs: int | None,
) -> Making | None:
    """None where a limit that the odds need is unset: then no probe has an end to reckon with."""
    run_min = questions[0].run_min if questions else None
    of_new = None if run_min is None else breaking_times_min(_new_probe(asked, questions, probes, story))
    if of_new is None or run_min is None:
        return None
    runs = _runs_lately(story, asked.moment) if planned_runs is None else planned_runs
    p_lost = _p_lost(story)
    rng = np.random.default_rng(2)  # fixed: the same question gets the same number
    served = [_runs(times, question, p_lost, rng) for question, times in _proven(questions)]
    on_shelf = np.stack(served) if served else np.zeros((0, len(of_new)))
    new = _runs(of_new, replace(questions[0], uses=0), p_lost, rng)
    if not (new > 0).any():
        return None
    good, made = _yield(probes, story)
    to_make = probes_to_make(runs, on_shelf, new[new > 0], good=good, made=made)
    unproven = sum(question.calibration is None and not question.out_of_use for question in questions)
    return Making(runs, to_make, unproven, " ".join(_kind(probes, story)), p_lost)


def _proven(questions: Sequence[Question]) -> list[tuple[Question, Floats]]:
    known = [(question, breaking_times_min(question)) for question in questions if question.calibration is not None]
    return [(question, times) for question, times in known if times is not None and not question.out_of_use]


def _runs(times_min: Floats, question: Question, p_lost: float, rng: np.random.Generator) -> Floats:
    """(D,) whole runs until fouled, used up or lost; the run that loses a probe is still served."""
    most = question.limits.value("most-uses")
    left = np.inf if most is None else max(0.0, most - question.uses)
    until_lost = rng.geometric(p_lost, len(times_min)) if p_lost > 0 else np.full(len(times_min), np.inf)
    return np.minimum(runs_within(times_min, question.run_min, left), until_lost)


def _runs_lately(story: Mapping[str, Sequence[Event]], moment: datetime) -> int:
    return sum(len(lives.of(_lately(events, moment), sheets.EXPOSURES)) for events in story.values())


def _p_lost(story: Mapping[str, Sequence[Event]]) -> float:
    """Per run, from this lab's own past (Jeffreys' mean, so that none lost yet is not never)."""
    runs = sum(len(lives.of(events, sheets.EXPOSURES)) for events in story.values())
    ends = [event.row["reason"] for events in story.values() for event in lives.of(events, sheets.RETIREMENTS)]
    lost = min(runs, sum(reason in NOT_WORN_OUT for reason in ends))
    return (lost + 0.5) / (runs + 1)


def _yield(probes: Sequence[Row], story: Mapping[str, list[Event]]) -> tuple[int, int]:
    """(usable, made) of the probes whose fate is known."""
    known = [events for probe in probes if told(events := story.get(probe["electrode"], []))]
    return sum(usable(events) for events in known), len(known)


def _kind(probes: Sequence[Row], story: Mapping[str, list[Event]]) -> tuple[str, str]:
    """Coating and fibre that most of the newest probes have."""
    newest = sorted(probes, key=lambda probe: (probe["made_on"] is not None, str(probe["made_on"])))[-NEWEST:]
    kinds = Counter((coating(story.get(probe["electrode"], [])), probe["fibre"] or "") for probe in newest)
    return kinds.most_common(1)[0][0]


def _new_probe(
    asked: Asked, questions: Sequence[Question], probes: Sequence[Row], story: Mapping[str, list[Event]]
) -> Question:
    """A probe not yet made: what the cohort says of its kind, calibrated on the day with the lab's usual noise."""
    film, fibre = _kind(probes, story)
    known = asked.cohort.events
    none = np.zeros(0)
    groups = {"coating": (film,), "fibre": (fibre,), "waveform": (asked.assay.waveform,), "batch": ("",)}
    whole, small = none.astype(np.int64), none.astype(np.int8)
    events = Events(whole, small, whole, none, none, ("",), known.settings, (), (), groups)
    drawn, place = posterior(asked.fit, events), known.settings.index(asked.setting)

    def log_sensitivity_at(run_min: float) -> NDArray[np.float64]:
        hours = np.zeros((1, len(known.settings)))
        hours[0, place] = run_min / 60
        return np.asarray(drawn.log_sensitivity(hours)[0])

    noises = [question.calibration.noise_na for question in questions if question.calibration]
    noise_na = statistics.median([noise for noise in noises if noise] or [0.0]) or None
    return replace(
        questions[0],
        log_sensitivity_at=log_sensitivity_at,
        reference_log_sensitivity=log_sensitivity_at(0.0),
        calibration=CalibrationFacts(age_h=0.0, noise_na=noise_na),
        uses=0,
        out_of_use="",
        after_cleaning={},
    )
