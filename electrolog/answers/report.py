"""What a report tells: of probes, or of the whole lab, with where it comes from."""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass
from datetime import date, datetime

from electrolog.answers import fits, kept_backtest
from electrolog.answers import life as lives
from electrolog.answers.answer import Answer
from electrolog.answers.asked import Run
from electrolog.answers.backtesting import backtested
from electrolog.answers.checking import Checked, Demands, check
from electrolog.answers.comparing import told, usable
from electrolog.answers.course import Ahead, Course, courses
from electrolog.answers.fan import typical_losses
from electrolog.answers.fitting import FittedCohort, fitted_cohort
from electrolog.answers.kept_backtest import KeptBacktest
from electrolog.answers.outlook import Outlook, outlook
from electrolog.answers.ranking import Ranked, ranking
from electrolog.answers.shelf import Filter, Shelved, shelf
from electrolog.clock import utc_now
from electrolog.errors import DataError
from electrolog.fouling.fit import METHOD as FIT_METHOD
from electrolog.fouling.typical import TypicalLoss
from electrolog.measure.version import METHOD as LINE_METHOD
from electrolog.record import journal, queries, sheets
from electrolog.record.corrections import corrections
from electrolog.record.journal import Entry
from electrolog.record.queries import Event
from electrolog.record.readable import Row, rows
from electrolog.record.store import Record

Progress = Callable[[str, int], None]  # what is under way, and how much of it


@dataclass(frozen=True)
class Origin(Answer):
    """Who made a report, when, from which state of the record (its journal's newest entry), by which methods."""

    made_by: str
    made_at: datetime
    version: str
    record: str
    entries: int
    head: str
    methods: dict[str, str]


@dataclass(frozen=True)
class Planned:
    """A run to judge the probes for; `demands` as for `check`."""

    run: Run
    demands: Demands


@dataclass(frozen=True)
class ProbeSheet(Answer):
    """One probe. void: per calibration that is the newest of its kind, what has happened since that it can't know.

    planned: the run that the verdict is for.
    """

    probe: Row
    life: tuple[Event, ...]
    state: lives.State
    courses: tuple[Course, ...]
    void: dict[str, tuple[str, ...]]
    corrections: tuple[Entry, ...]
    verdict: Checked | None
    planned: Planned | None = None


@dataclass(frozen=True)
class BatchSheet:
    """served of told: how many of those whose fate is known came to serve or still can."""

    batch: str
    made_on: date | None
    made_by: str | None
    fibre: str | None
    probes: int
    retired: int
    served: int
    told: int


@dataclass(frozen=True)
class CohortSheet:
    analyte: str
    fit: FittedCohort
    typical: tuple[TypicalLoss, ...]


@dataclass(frozen=True)
class LabSheet(Answer):
    """cohorts: of the analytes whose fit is at hand; `without_fit` names the others. tested: the kept backtests;
    `untested`: per other analyte, why there is none.
    """

    shelf: tuple[Shelved, ...]
    batches: tuple[BatchSheet, ...]
    cohorts: tuple[CohortSheet, ...]
    without_fit: tuple[str, ...]
    verdicts: tuple[Ranked, ...]
    outlook: Outlook | None
    no_outlook: str
    tested: tuple[KeptBacktest, ...] = ()
    untested: tuple[tuple[str, str], ...] = ()


def origin(record: Record, moment: datetime | None = None) -> Origin:
    from importlib.metadata import PackageNotFoundError, version

    try:
        release = version("electrolog")
    except PackageNotFoundError:
        release = "from source"
    with record.reading() as connection:
        entries, head = journal.head(connection)
    methods = {"calibration": LINE_METHOD, "cohort and forecast": FIT_METHOD}
    return Origin(record.who, moment or utc_now(), release, record.name, entries, head, methods)


def probe_sheets(
    record: Record, labels: Sequence[str], planned: Planned | None = None, moment: datetime | None = None
) -> list[ProbeSheet]:
    """In the order of labels. Raises UnknownName."""
    moment = moment or utc_now()
    ahead = None if planned is None else Ahead(planned.run.setting, planned.run.run_min)
    # Judged first: that makes the fit which the forecasts are then drawn by.
    found = [] if planned is None else check(record, labels, planned.run, planned.demands, moment)
    drawn = courses(record, labels, ahead=ahead, moment=moment)
    verdicts = {one.electrode: one for one in found}
    with record.reading() as connection:
        probes = {probe["electrode"]: probe for probe in queries.probes(connection, labels)}
        life = queries.events(connection, [probe["id"] for probe in probes.values()])
        corrected = {label: corrections(connection, probe["id"]) for label, probe in probes.items()}
    return [
        ProbeSheet(
            probe=probes[label],
            life=tuple(life.get(label, ())),
            state=lives.state(life.get(label, ()), moment),
            courses=tuple(course for course in drawn if course.electrode == label),
            void=_void(life.get(label, []), moment),
            corrections=tuple(corrected[label]),
            verdict=verdicts.get(label),
            planned=planned,
        )
        for label in labels
    ]


def _void(life: list[Event], moment: datetime) -> dict[str, tuple[str, ...]]:
    newest = {(e.row["analyte"], e.row["waveform"]): e for e in lives.of(life, sheets.CALIBRATIONS) if e.at <= moment}
    return {one.row["calibration"]: tuple(lives.voided_by(life, one, moment)) for one in newest.values()}


def lab_sheet(
    record: Record,
    planned: Planned | None = None,
    moment: datetime | None = None,
    *,
    backtest: bool = False,
    progress: Progress | None = None,
) -> LabSheet:
    """No cohort is fitted for it, unless a run is to be judged, and none is backtested, unless that is asked for: a
    report must not take minutes unasked.
    """
    moment, tell = moment or utc_now(), progress or (lambda what, done: None)
    everything = shelf(record, Filter(state="all"), moment)
    with record.reading() as connection:
        probes, life = queries.probes(connection), queries.events(connection)
        batches = rows(connection, sheets.BATCHES, order=("batch",))
    verdicts: tuple[Ranked, ...] = ()
    expected, no_outlook = None, "that is told for one kind of run: --analyte, --waveform, --setting and --run name it"
    if planned is not None:
        tell("judging the probes", 0)
        verdicts = ranking(record, None, planned.run, planned.demands, moment).probes
        tell("looking ahead for probes", len(verdicts))
        expected, no_outlook = _outlook(record, planned, moment)
    used = list(dict.fromkeys(one.analyte for one in everything if one.analyte is not None))
    at_hand = [name for name in used if fits.is_kept(record, name)]
    tested, untested = _backtests(record, used, tell if backtest else None)
    return LabSheet(
        shelf=tuple(everything),
        batches=tuple(_batch(row, probes, life) for row in batches),
        cohorts=tuple(_cohort(record, name) for name in at_hand),
        without_fit=tuple(name for name in used if name not in at_hand),
        verdicts=verdicts,
        outlook=expected,
        no_outlook=no_outlook,
        tested=tested,
        untested=untested,
    )


def _cohort(record: Record, analyte: str) -> CohortSheet:
    return CohortSheet(analyte, fitted_cohort(record, analyte), tuple(typical_losses(record, analyte)))


def _outlook(record: Record, planned: Planned, moment: datetime) -> tuple[Outlook | None, str]:
    try:
        return outlook(record, None, planned.run, planned.demands, moment=moment), ""
    except DataError as error:
        return None, error.message


def _backtests(
    record: Record, analytes: Sequence[str], progress: Progress | None
) -> tuple[tuple[KeptBacktest, ...], tuple[tuple[str, str], ...]]:
    """The kept ones; with `progress` they are made anew, and it is told of it."""
    why: dict[str, str] = {}
    for analyte in analytes if progress is not None else ():
        try:
            backtested(record, analyte, progress=progress)
        except DataError as error:
            why[analyte] = error.message
    found = {name: kept_backtest.kept(record, name) for name in analytes}
    tested = tuple(one for one in found.values() if one is not None)
    untested = tuple((name, why.get(name, kept_backtest.NONE_MADE)) for name, one in found.items() if one is None)
    return tested, untested


def _batch(row: Row, probes: Sequence[Row], life: Mapping[str, list[Event]]) -> BatchSheet:
    own = [life.get(probe["electrode"], []) for probe in probes if probe["batch"] == row["batch"]]
    return BatchSheet(
        batch=row["batch"],
        made_on=row["made_on"],
        made_by=row["made_by"],
        fibre=row["fibre"],
        probes=len(own),
        retired=sum(bool(lives.of(story, sheets.RETIREMENTS)) for story in own),
        served=sum(usable(story) for story in own),
        told=sum(told(story) for story in own),
    )
