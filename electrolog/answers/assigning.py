"""Which probe serves which planned run, and why some runs can't be served."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace
from datetime import datetime

import numpy as np
from numpy.typing import NDArray

from electrolog.answers import fits
from electrolog.answers.answer import Answer
from electrolog.answers.asked import Run
from electrolog.answers.board import Board, board, in_order
from electrolog.answers.cards import Card
from electrolog.answers.checking import Demands, limits_in_force
from electrolog.answers.cohorts import REFERENCE_SETTING
from electrolog.answers.plan import PlanRow
from electrolog.answers.ranking import shelf_on
from electrolog.clock import shown_moment, utc_now
from electrolog.errors import FaultyRows, InputError, UnknownName
from electrolog.fouling.parameters import WEIGHT
from electrolog.judge.assign import Place, PlannedRun, SuccessTable, Week, assign
from electrolog.judge.limits import contradictions
from electrolog.judge.planning import success_table
from electrolog.judge.shelf import Shelf
from electrolog.judge.words import nothing_asked, unset
from electrolog.record import queries
from electrolog.record.names import Names
from electrolog.record.store import Record

STEPS, FAR_STEPS = 16, 6  # of a success table; the odds between two are close to a line
Kind = tuple[str, str, str, float | None, str]


@dataclass(frozen=True)
class Placed(Answer):
    """A run and who serves it: the odds that no limit is broken by its end. electrode None: nobody, and `why`."""

    label: str
    start: datetime
    duration_min: float
    analyte: str
    waveform: str
    setting: str
    electrode: str | None
    p_success: float | None
    used_before_min: float
    why: str


@dataclass(frozen=True)
class Assignment(Answer):
    """p_all: the odds that every served run succeeds."""

    runs: tuple[Placed, ...]
    p_all: float | None
    notes: tuple[str, ...]


def assigned(
    record: Record, plan: Sequence[PlanRow], *, turnaround_min: float, moment: datetime | None = None
) -> Assignment:
    """Raises FaultyRows for runs that have begun, InputError where a limit that every plan needs isn't set."""
    moment = moment or utc_now()
    _refuse_past(plan, moment)
    plan = _spelled(record, plan)
    boards, shelves = _asked(record, plan, moment)
    first = next(iter(boards.values()))
    clock = _Clock.of(plan, first)
    tables = {_name(kind): _table(boards[kind], shelves[kind], plan, clock) for kind in boards}
    week = Week(
        runs=[_planned(row, clock) for row in plan],
        tables=tables,
        available=_available(plan, first),
        uses_left=_uses_left(list(shelves.values()), len(plan)),
        least_success=1 - max(_risk(shelf) for shelf in shelves.values()),
        turnaround_min=turnaround_min,
    )
    places = assign(week) if first.cards else tuple(_nobody(run) for run in week.runs)
    served = [place.p_success for place in places if place.p_success is not None]
    labels = [card.electrode for card in first.cards]
    runs = tuple(_placed(row, place, labels) for row, place in zip(plan, places, strict=True))
    notes = tuple(dict.fromkeys(f"{one.assay.analyte}: {note}" for one in boards.values() for note in one.fit.notes))
    return Assignment(runs, float(np.prod(served)) if served else None, (*clock.notes, *notes))


def _refuse_past(plan: Sequence[PlanRow], moment: datetime) -> None:
    past = [row for row in plan if row.start < moment]
    if past:
        faults = [f"run '{row.label}' starts {shown_moment(row.start)}" for row in past]
        raise FaultyRows(f"{len(past)} runs start before {shown_moment(moment)}; accepted: runs to come", faults)


def _kind(row: PlanRow) -> Kind:
    return row.run.analyte, row.run.waveform, row.run.setting, row.needs_um, row.project


def _name(kind: Kind) -> str:
    return "\n".join("" if part is None else str(part) for part in kind)


def _spelled(record: Record, plan: Sequence[PlanRow]) -> list[PlanRow]:
    """The plan in the record's own spelling. Raises FaultyRows for every name that it doesn't know."""
    found, faults = [], []
    with record.reading() as connection:
        names = Names(connection)
        for row in plan:
            try:
                assay = fits.assay(connection, row.run.analyte, row.run.waveform)
                setting = names.word("setting", row.run.setting)
            except UnknownName as error:
                faults.append(f"run '{row.label}': {error.message}")
                continue
            run = Run(assay.analyte, assay.waveform, setting, row.run.run_min)
            found.append(replace(row, run=run))
    if faults:
        raise FaultyRows(f"{len(faults)} runs name what the record doesn't know; nothing was assigned", faults)
    return found


def _asked(record: Record, plan: Sequence[PlanRow], moment: datetime) -> tuple[dict[Kind, Board], dict[Kind, Shelf]]:
    """Runs alike in analyte and waveform are forecast once; the probes stand in the same order on every board."""
    forecast: dict[tuple[str, str], Board] = {}
    boards: dict[Kind, Board] = {}
    shelves: dict[Kind, Shelf] = {}
    with record.reading() as connection:
        stored = queries.limits(connection)
    for row in plan:
        kind, assay = _kind(row), (row.run.analyte, row.run.waveform)
        if assay not in forecast:
            forecast[assay] = in_order(board(record, None, row.run, moment))
        if kind not in boards:
            boards[kind] = replace(forecast[assay], setting=row.run.setting)
            demands = Demands(row.needs_um, row.project)
            limits = limits_in_force(stored, boards[kind], demands)
            shelves[kind] = shelf_on(boards[kind], row.run, limits, demands)
            _refuse_unset(row, shelves[kind])
    return boards, shelves


def _refuse_unset(row: PlanRow, shelf: Shelf) -> None:
    """Without an accepted risk, or anything that a probe must still do, no probe could be called good enough."""
    against = contradictions(shelf.limits)
    if against:
        raise InputError(f"the limits contradict each other: {'; '.join(against)}", "`electrolog limits` shows them")
    if shelf.limits.accepted_risk() is None:
        raise InputError(unset("accepted-risk").text, "set it with `electrolog limits set accepted-risk 5%`")
    at_end = any(shelf.limits.value(rule) for rule in ("least-share-left", "highest-detection-limit"))
    if not at_end and row.needs_um is None:
        raise InputError(f"run '{row.label}': {nothing_asked().text}")


def _risk(shelf: Shelf) -> float:
    risk = shelf.limits.accepted_risk()
    return 0.0 if risk is None else risk.value


@dataclass(frozen=True)
class _Clock:
    """Minutes of one setting in which all wear is counted, and what a minute of the others is worth in it."""

    setting: str
    weights: Mapping[str, float]
    notes: tuple[str, ...]

    @classmethod
    def of(cls, plan: Sequence[PlanRow], there: Board) -> _Clock:
        settings = {row.run.setting for row in plan}
        if len(settings) == 1:
            return cls(there.setting, {}, ())
        learned = {row["setting"]: row["median"] for row in there.fit.summary["settings"]}
        weights = {name: learned.get(name, float(np.exp(WEIGHT[0]))) for name in settings}
        said = ", ".join(f"{name} {weights[name]:.2g}" for name in sorted(settings))
        return cls(REFERENCE_SETTING, weights, (f"runs in several settings: an hour counts as in-vivo hours: {said}",))

    def wear_min(self, row: PlanRow) -> float:
        return row.run.run_min * self.weights.get(row.run.setting, 1.0)


def _planned(row: PlanRow, clock: _Clock) -> PlannedRun:
    return PlannedRun(row.label, row.start, row.run.run_min, _name(_kind(row)), clock.wear_min(row))


def _table(there: Board, shelf: Shelf, plan: Sequence[PlanRow], clock: _Clock) -> SuccessTable:
    """Up to the wear of the whole plan: no probe can be worn by more."""
    whole = sum(clock.wear_min(row) for row in plan)
    longest = max(clock.wear_min(row) for row in plan)
    # Finer where most runs end: no probe serves more than a few of them.
    near = np.linspace(0, min(whole, 4 * longest), STEPS)
    grid = near if whole <= near[-1] else np.append(near, np.geomspace(near[-1], whole, FAR_STEPS + 1)[1:])
    return success_table(replace(shelf, log_sensitivity_at=there.log_sensitivity_in(clock.setting)), grid)


def _available(plan: Sequence[PlanRow], there: Board) -> NDArray[np.bool_]:
    """(R, P) made by then, and out of any run that is under way; not where the order of things is open."""
    found = np.array([[_there(card, row) for card in there.cards] for row in plan], dtype=bool)
    return found.reshape(len(plan), len(there.cards))


def _there(card: Card, row: PlanRow) -> bool:
    made = card.made_on is None or card.made_on <= row.start.date()
    free = card.in_use_until is None or card.in_use_until <= row.start
    return made and free and (card.aside is None or card.aside.rule != "clocks")


def _uses_left(shelves: Sequence[Shelf], runs: int) -> NDArray[np.int64]:
    left = np.full(len(shelves[0].uses), runs, dtype=np.int64)
    for shelf in shelves:
        most = shelf.limits.value("most-uses")
        if most is not None:
            left = np.minimum(left, np.maximum(0, int(most) - np.array(shelf.uses, dtype=np.int64)))
    return left


def _nobody(run: PlannedRun) -> Place:
    return Place(run, None, None, 0.0, "no probe: there are none")


def _placed(row: PlanRow, place: Place, labels: Sequence[str]) -> Placed:
    run = row.run
    probe = None if place.probe is None else labels[place.probe]
    served = (probe, place.p_success, place.wear_before_min, place.why)
    return Placed(row.label, row.start, run.run_min, run.analyte, run.waveform, run.setting, *served)
