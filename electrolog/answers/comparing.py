"""Do kinds of probes differ: coating, fibre, maker, batch, waveform, cure, or what a cleaning brings back?

Each probe counts once, retired ones too. Its level is its first usable calibration; its loss, by its own last one, per
hour in vivo (hours elsewhere weighed as the lab's fit has learned). The waveform is one unless waveforms are compared.
"""

from __future__ import annotations

import itertools
import math
from collections import Counter, defaultdict
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace

import numpy as np

from electrolog.answers import life as lives
from electrolog.answers.answer import Answer
from electrolog.answers.cohorts import coating, unusable
from electrolog.answers.figures import all_figures
from electrolog.answers.fits import fit_for
from electrolog.answers.fitting import whole_cohort
from electrolog.answers.kinds import By
from electrolog.clock import utc_now
from electrolog.errors import DataError, InputError
from electrolog.judge.compare import Comparison, Difference, Estimate, Groups, compare
from electrolog.judge.experiment import Making, make_next
from electrolog.measure.calibrate import CalibrationFigures
from electrolog.record import queries, sheets
from electrolog.record.names import Names
from electrolog.record.queries import Event
from electrolog.record.readable import Row, row_by_id
from electrolog.record.sheets import WAVEFORMS
from electrolog.record.store import Connection, Record

LEVEL, LOSS, GAIN, YIELD = "sensitivity when new (nA/µM)", "loss per hour in vivo", "gain by cleaning", "yield"
LEAST_HOURS = 0.5  # in vivo: over less, a loss is a quotient of two errors
UNKNOWN_END = ("lost", "left in tissue")  # says nothing of how long it would have lasted


@dataclass(frozen=True)
class Compared(Answer):
    """waveform: of the calibrations compared, "" for all. after_h: of the share left.

    next: where more probes would teach most; None where that can't be told.
    """

    by: By
    analyte: str
    waveform: str
    after_h: float
    comparison: Comparison
    next: Making | None
    notes: tuple[str, ...]


@dataclass(frozen=True)
class _Lab:
    analyte: str
    waveform: str
    probes: Sequence[Row]
    life: Mapping[str, list[Event]]
    figures: Mapping[int, CalibrationFigures]
    weights: Mapping[str, float]
    slips: frozenset[tuple[str, int]]

    def readings(self, probe: Row, waveform: str) -> list[Event]:
        """Usable ones; what the fit takes for a slip would drown every difference."""
        found = lives.comparable_calibrations(self.life.get(probe["electrode"], []), self.analyte, waveform)
        known = [event for event in found if not unusable(self.figures[event.row["id"]])]
        unit = f"{probe['electrode']}\n{waveform}"
        return [event for place, event in enumerate(known) if (unit, place) not in self.slips]

    def sensitivity(self, event: Event) -> float:
        return self.figures[event.row["id"]].sensitivity_na_um or math.nan

    def hours(self, story: Sequence[Event]) -> float:
        """In vivo, or worth as much."""
        found = lives.exposure_h(story)
        return sum(hours * self.weights.get(setting, 1.0) for setting, hours in found.items())


def compared(
    record: Record, by: By, analyte: str, waveform: str | None = None, *, after_h: float = 10.0, more: int = 6
) -> Compared:
    """`more` probes are dealt out over the groups. Raises UnknownName, InputError, DataError for fewer than two."""
    if not after_h > 0 or more < 0:
        raise InputError(f"{after_h:g} hours, {more} more probes; accepted: hours above zero, probes none or more")
    lab = _lab(record, by, analyte, waveform)
    groups = _cleanings(lab) if by is By.CLEANING else _kinds(lab, by)
    names = {name for measure in (*groups.values.values(), *groups.shares.values()) for name in measure}
    if len(names) < 2:
        raise DataError(
            f"{len(names)} groups by {by} ({', '.join(sorted(names)) or 'none'}); two are needed to compare",
            "log what distinguishes the probes, or compare by something else",
        )
    comparison = _with_share_left(compare(groups), after_h)
    return Compared(by, lab.analyte, lab.waveform, after_h, comparison, _next(groups, more), _notes(lab, by))


def groups_of(record: Record, by: By, analyte: str, waveform: str | None = None) -> Groups:
    """What is known of each group, probe by probe. Raises UnknownName, DataError where nothing was calibrated."""
    lab = _lab(record, by, analyte, waveform)
    return _cleanings(lab) if by is By.CLEANING else _kinds(lab, by)


def _lab(record: Record, by: By, analyte: str, waveform: str | None) -> _Lab:
    now = utc_now()
    with record.reading() as connection:
        assay = whole_cohort(connection, analyte)
        probes, told = queries.probes(connection), queries.events(connection)
        found = queries.calibrations(connection, None, assay.analyte_id)
        chosen = "" if by is By.WAVEFORM else _waveform(connection, waveform, [one.row["waveform"] for one in found])
    life = {label: lives.until(events, now) for label, events in told.items()}
    summary = fit_for(record, assay, units=()).summary
    weights = {row["setting"]: row["median"] for row in summary["settings"]}
    slips = frozenset((row["unit"], row["reading"]) for row in summary["slips"])
    return _Lab(assay.analyte, chosen, probes, life, all_figures(record, found), weights, slips)


def _waveform(connection: Connection, typed: str | None, used: Sequence[str]) -> str:
    if typed is not None:
        row_id = Names(connection).row_id("waveforms", typed)
        return str(row_by_id(connection, WAVEFORMS, row_id)["waveform"])
    if not used:
        raise DataError("nothing was calibrated with this analyte: there is nothing to compare")
    return Counter(used).most_common(1)[0][0]


def _kinds(lab: _Lab, by: By) -> Groups:
    levels: dict[str, list[float]] = defaultdict(list)
    losses: dict[str, list[float]] = defaultdict(list)
    counts: dict[str, tuple[int, int]] = {}
    ends: dict[str, tuple[list[float], list[bool]]] = defaultdict(lambda: ([], []))
    for probe in lab.probes:
        story = lab.life.get(probe["electrode"], [])
        for group, waveform in _groups_of(lab, by, probe, story):
            readings = lab.readings(probe, waveform)
            if readings:
                levels[group].append(lab.sensitivity(readings[0]))
            loss = _loss_per_hour(lab, story, readings)
            if loss is not None:
                losses[group].append(loss)
            good, made = counts.get(group, (0, 0))
            counts[group] = (good + usable(story), made + told(story))
            if made_use_of(story):
                ends[group][0].append(lab.hours(story))
                ends[group][1].append(_ended(story))
    return Groups(
        values={LEVEL: levels, LOSS: losses},
        ratio_measures=(LEVEL,),
        shares={} if by is By.WAVEFORM else {YIELD: counts},
        lives={} if by is By.WAVEFORM else {name: pair for name, pair in ends.items() if pair[0]},
    )


def _groups_of(lab: _Lab, by: By, probe: Row, story: Sequence[Event]) -> list[tuple[str, str]]:
    """(group, waveform): one, or one per waveform where these are compared; none where the kind isn't known."""
    if by is By.WAVEFORM:
        own = [event.row for event in lives.of(story, sheets.CALIBRATIONS) if event.row["analyte"] == lab.analyte]
        return [(name, name) for name in dict.fromkeys(row["waveform"] for row in own)]
    name = _kind(by, probe, story)
    return [(name, lab.waveform)] if name else []


def _kind(by: By, probe: Row, story: Sequence[Event]) -> str:
    if by is By.COATING:
        return coating(story)
    if by is By.CURE:
        films = lives.of(story, sheets.COATINGS)
        celsius = films[-1].row["cure_temperature_c"] if films else None
        return "" if celsius is None else f"{celsius:g} °C"
    column = {By.FIBRE: "fibre", By.MAKER: "made_by", By.BATCH: "batch"}[by]
    return probe[column] or ""


def _loss_per_hour(lab: _Lab, story: Sequence[Event], readings: Sequence[Event]) -> float | None:
    """By the first calibration and the last before anything was renewed; None without enough exposure between them."""
    if len(readings) < 2:
        return None
    first = readings[0]
    renewed = [event.at for event in story if event.sheet in lives.RENEWING and event.at > first.at]
    last = [event for event in readings if not renewed or event.at < min(renewed)][-1]
    hours = lab.hours([event for event in story if first.at <= event.at < last.at])
    if hours < LEAST_HOURS:
        return None
    return math.log(lab.sensitivity(first) / lab.sensitivity(last)) / hours


def usable(story: Sequence[Event]) -> bool:
    """Came to serve, or still can: ran, or is calibrated and not given up."""
    given_up = bool(lives.of(story, sheets.RETIREMENTS))
    return made_use_of(story) or (bool(lives.of(story, sheets.CALIBRATIONS)) and not given_up)


def told(story: Sequence[Event]) -> bool:
    """Whether it is known by now what became of a probe: usable, or given up before it ran."""
    return usable(story) or bool(lives.of(story, sheets.RETIREMENTS))


def made_use_of(story: Sequence[Event]) -> bool:
    return bool(lives.of(story, sheets.EXPOSURES))


def _ended(story: Sequence[Event]) -> bool:
    return any(event.row["reason"] not in UNKNOWN_END for event in lives.of(story, sheets.RETIREMENTS))


def _cleanings(lab: _Lab) -> Groups:
    """Per method, sensitivity after over before, where a cleaning alone lies between two calibrations."""
    gains: dict[str, list[float]] = defaultdict(list)
    for probe in lab.probes:
        story = lab.life.get(probe["electrode"], [])
        readings = lab.readings(probe, lab.waveform)
        for before, after in itertools.pairwise(readings):
            between = [event for event in story if before.at < event.at < after.at]
            changing = [event for event in between if event.sheet in (sheets.EXPOSURES, *lives.RENEWING)]
            if len(changing) == 1 and changing[0].sheet is sheets.CLEANINGS:
                gains[changing[0].row["method"]].append(lab.sensitivity(after) / lab.sensitivity(before))
    return Groups(values={GAIN: gains}, ratio_measures=(GAIN,))


def _with_share_left(found: Comparison, after_h: float) -> Comparison:
    """The loss once more as the share left after so many hours: the same tests, so they are not counted twice."""
    name = f"share left after {after_h:g} h"
    estimates = [_share_of(one, name, after_h) for one in found.estimates if one.measure == LOSS]
    differences = [_ratio_of(one, name, after_h) for one in found.differences if one.measure == LOSS]
    return replace(found, estimates=(*found.estimates, *estimates), differences=(*found.differences, *differences))


def _share_of(one: Estimate, name: str, after_h: float) -> Estimate:
    low, value, high = (_left(loss, after_h) for loss in (one.high, one.value, one.low))
    return replace(one, measure=name, value=value, low=low, high=high)


def _ratio_of(one: Difference, name: str, after_h: float) -> Difference:
    low, value, high = (_left(loss, after_h) for loss in (one.high, one.value, one.low))
    return replace(one, measure=name, as_ratio=True, value=value, low=low, high=high)


def _left(loss_per_hour: float | None, hours: float) -> float | None:
    return None if loss_per_hour is None else math.exp(-loss_per_hour * hours)


def _next(groups: Groups, more: int) -> Making | None:
    """By the loss where that is known, else by the level or the gain, on its own scale."""
    for measure in (LOSS, LEVEL, GAIN):
        known = {name: np.asarray(values) for name, values in groups.values.get(measure, {}).items()}
        known = {name: values for name, values in known.items() if len(values)}
        if len(known) > 1 and any(len(values) > 1 for values in known.values()):
            if measure in groups.ratio_measures:
                known = {name: np.log(values) for name, values in known.items()}
            return make_next(known, more)
    return None


def _notes(lab: _Lab, by: By) -> tuple[str, ...]:
    said = ["probes were not dealt to the groups by chance: whatever else differs between them is in the difference"]
    if by in (By.COATING, By.FIBRE, By.MAKER, By.CURE):
        said += _same_batches(lab, by)
    if lab.waveform:
        said.append(f"calibrations with {lab.waveform} only")
    if lab.slips:
        said.append(f"{len(lab.slips)} calibrations look like slips of a unit or a decimal and are left out")
    return tuple(said)


def _same_batches(lab: _Lab, by: By) -> list[str]:
    """A kind that was made in one batch can't be told from that batch."""
    batches: dict[str, set[str]] = defaultdict(set)
    for probe in lab.probes:
        name = _kind(by, probe, lab.life.get(probe["electrode"], []))
        if name and probe["batch"]:
            batches[name].add(probe["batch"])
    alone = sorted(name for name, made in batches.items() if len(made) == 1)
    return [f"{', '.join(alone)}: of one batch alone, so kind and batch can't be told apart"] if alone else []
