"""The verdict before a run: what is known of each probe, put to the judge."""

from __future__ import annotations

import statistics
from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass, field
from datetime import datetime, timedelta
from typing import Protocol

import numpy as np

from electrolog.answers import fits
from electrolog.answers import life as lives
from electrolog.answers.answer import Answer
from electrolog.answers.asked import Asked, Floats, Run, ask
from electrolog.answers.fits import Assay
from electrolog.answers.standing import notes, out_of_use, unanswerable
from electrolog.errors import unknown
from electrolog.judge.decision import RETIRE, UNDETERMINED
from electrolog.judge.facts import CalibrationFacts
from electrolog.judge.limits import LimitRow, Limits, effective
from electrolog.judge.odds import NEEDS
from electrolog.judge.question import Question
from electrolog.judge.verdict import Verdict, judge
from electrolog.record import queries
from electrolog.record.queries import Event
from electrolog.record.readable import Row
from electrolog.record.store import Connection, Record


@dataclass(frozen=True)
class Demands:
    """What the run asks beyond the lab's limits; `limits` override them for this run."""

    needs_um: float | None = None
    project: str = ""
    limits: Mapping[str, float] = field(default_factory=dict)


class OfAnAssay(Protocol):
    @property
    def assay(self) -> Assay: ...


@dataclass(frozen=True)
class Checked(Answer):
    electrode: str
    verdict: Verdict
    notes: tuple[str, ...]
    limits: Limits


def check(
    record: Record, labels: Sequence[str], run: Run, demands: Demands, moment: datetime | None = None
) -> list[Checked]:
    """One verdict per probe, in the order of labels."""
    asked = ask(record, labels, run, moment)
    limits, standards = rules_of_the_lab(record, asked, demands)
    found = []
    for place, label in enumerate(asked.labels):
        verdict = _verdict(question_of(asked, place, run, limits, demands, standards), asked, label)
        found.append(Checked(label, verdict, (*_asked_too_much(verdict, limits), *notes(asked, label)), limits))
    return found


def _asked_too_much(verdict: Verdict, limits: Limits) -> tuple[str, ...]:
    """A sound probe that can't see as little as this run needs must not be thrown away for it."""
    others = [p for rule, p in verdict.p_by_rule.items() if rule != NEEDS]
    risk = limits.accepted_risk()
    if (
        verdict.verdict != RETIRE
        or risk is None
        or NEEDS not in verdict.p_by_rule
        or max(others, default=1.0) > risk.value
    ):
        return ()
    return ("only what this run needs is beyond it; the lab's own limits it keeps: for other runs it may still serve",)


def rules_of_the_lab(record: Record, asked: Asked, demands: Demands) -> tuple[Limits, dict[str, Row]]:
    """The limits in force, and the standards by label that the probes were calibrated with."""
    with record.reading() as connection:
        # A project is known by any of its limits, so that those of other analytes are read too where one is named.
        stored = queries.limits(connection, None if demands.project else asked.assay.analyte_id)
        limits = limits_in_force(stored, asked, demands)
        return limits, standards_of(connection, asked)


def standards_of(connection: Connection, asked: Asked) -> dict[str, Row]:
    """Those that the probes asked about were calibrated with, by label."""
    return queries.standards(connection, [e.row.get("standard") for life in asked.life.values() for e in life])


def _verdict(question: Question, asked: Asked, label: str) -> Verdict:
    reason = unanswerable(asked, label)
    return judge(question) if reason is None else Verdict(UNDETERMINED, (reason,))


def limits_in_force(stored: Sequence[Row], asked: OfAnAssay, demands: Demands) -> Limits:
    """Raises UnknownName for a project without a limit: a typing error there would quietly judge by the lab's own."""
    found = [
        LimitRow(row["rule"], row["value"], row["origin"], row["analyte"] or "", row["project"] or "") for row in stored
    ]
    project = _project_spelled(demands.project, {row.project for row in found if row.project})
    return effective(found, analyte=asked.assay.analyte, project=project, per_run=demands.limits)


def _project_spelled(typed: str, known: set[str]) -> str:
    spelled = {name.casefold(): name for name in known}.get(typed.casefold(), typed)
    if spelled and spelled not in known:
        hint = "without --project the lab's own limits hold; `electrolog limits set RULE VALUE --project NAME` adds one"
        raise unknown("project", typed, known, hint)
    return spelled


def question_of(
    asked: Asked, place: int, run: Run, limits: Limits, demands: Demands, standards: Mapping[str, Row]
) -> Question:
    label = asked.labels[place]
    life = asked.life[label]
    reference = asked.reference_draws(place)
    return Question(
        run_min=run.run_min,
        log_sensitivity_at=_outlook(asked, place),
        limits=limits,
        calibration=calibration_facts(asked, label, standards),
        reference_log_sensitivity=None if reference is None else np.log(reference),
        reading_sd_log=fits.reading_sd_log(asked.fit),
        needs_um=demands.needs_um,
        uses=lives.state(life, asked.moment).uses,
        assay=asked.assay.said,
        out_of_use=out_of_use(label, life, asked.moment),
        after_cleaning=_after_cleaning(asked, place),
    )


def _outlook(asked: Asked, place: int) -> Callable[[float], Floats]:
    alone = asked.posterior.only(np.array([place]))

    def log_sensitivity_at(run_min: float) -> Floats:
        found: Floats = alone.log_sensitivity(asked.extra_hours(run_min)[place : place + 1])[0]
        return found

    return log_sensitivity_at


def _after_cleaning(asked: Asked, place: int) -> dict[str, Callable[[float], Floats]]:
    """Per cleaning method whose recovery this lab's record has taught the fit."""
    known = [name.removeprefix("clean:") for name in fits.known_renewals(asked.fit) if name.startswith("clean:")]
    return {method: _cleaned(asked, place, f"clean:{method}") for method in known}


def _cleaned(asked: Asked, place: int, renewal: str) -> Callable[[float], Floats]:
    def log_sensitivity_at(run_min: float) -> Floats:
        alone = asked.after(renewal).only(np.array([place]))
        found: Floats = alone.log_sensitivity(asked.extra_hours(run_min)[place : place + 1])[0]
        return found

    return log_sensitivity_at


def calibration_facts(asked: Asked, label: str, standards: Mapping[str, Row]) -> CalibrationFacts | None:
    """The last calibration with the assay's analyte and waveform, and what has happened since."""
    life = asked.life[label]
    comparable = lives.comparable_calibrations(life, asked.assay.analyte, asked.assay.waveform)
    if not comparable:
        return None
    last = comparable[-1]
    figures = asked.figures[last.row["id"]]
    blanks = asked.blanks_na(last)
    return CalibrationFacts(
        age_h=(asked.moment - last.at) / timedelta(hours=1),
        events_since=tuple(lives.voided_by(life, last, asked.moment)),
        standard_past_use_by=_past_use_by(last, standards),
        noise_na=last.row["noise_na"],
        noise_before_na=comparable[-2].row["noise_na"] if len(comparable) > 1 else None,
        blank_sd_na=statistics.stdev(blanks) if len(blanks) > 1 else None,
        blank_degrees_of_freedom=len(blanks) - 1 if len(blanks) > 1 else None,
        residual_sd_na=figures.residual_sd_na,
        residual_degrees_of_freedom=figures.degrees_of_freedom,
        r_squared=figures.r_squared,
        peak_shift_v=_peak_shift(asked, label, last),
    )


def _past_use_by(calibration: Event, standards: Mapping[str, Row]) -> bool:
    standard = standards.get(calibration.row["standard"] or "")
    return bool(standard and standard["expires_at"] and calibration.at > standard["expires_at"])


def _peak_shift(asked: Asked, label: str, last: Event) -> float | None:
    first = lives.reference(asked.life[label], asked.assay.analyte, asked.assay.waveform, asked.moment)
    peaks = [event.row["oxidation_peak_v"] for event in (first, last) if event is not None]
    if len(peaks) < 2 or None in peaks:
        return None
    return float(peaks[1] - peaks[0])
