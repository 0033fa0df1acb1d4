"""Control charts of a check probe or check standard, one per rig: is this rig still what it was?"""

from __future__ import annotations

import math
from collections import defaultdict
from collections.abc import Sequence
from dataclasses import dataclass
from datetime import datetime

from electrolog.answers.answer import Answer
from electrolog.answers.history import Reading, readings
from electrolog.answers.quantities import Quantity
from electrolog.errors import DataError, InputError
from electrolog.measure import control as charts
from electrolog.measure.control import Chart, Cusum
from electrolog.record.names import Names
from electrolog.record.store import Record
from electrolog.units import counted

FEWEST = 4  # three ranges are little enough to set limits by


_COLUMNS = {
    Quantity.NOISE: ("noise_na", "nA"),
    Quantity.BACKGROUND: ("background_na", "nA"),
    Quantity.OXIDATION: ("oxidation_peak_v", "V"),
    Quantity.REDUCTION: ("reduction_peak_v", "V"),
}


@dataclass(frozen=True)
class Plotted:
    calibration: str
    electrode: str
    at: datetime
    value: float


@dataclass(frozen=True)
class Controlled(Answer):
    """The charts of one rig, all over the same points. `signals`: (index of the point, rule that it breaks)."""

    rig: str
    what: str
    unit: str
    points: tuple[Plotted, ...]
    baseline: int
    individuals: Chart
    moving_range: Chart
    ewma: Chart
    cusum: Cusum
    signals: tuple[tuple[int, str], ...]
    notes: tuple[str, ...]


@dataclass(frozen=True)
class Wanted:
    """Which readings; `baseline`: how many of the first set the limits (None: all)."""

    analyte: str | None = None
    waveform: str | None = None
    rig: str | None = None
    standard: str | None = None
    baseline: int | None = None


def control(
    record: Record,
    labels: Sequence[str],
    quantity: Quantity,
    wanted: Wanted,
) -> list[Controlled]:
    """Of the named probes; several are charted as shares of each one's own mean. Raises DataError where too few."""
    found = readings(record, labels, wanted.analyte, wanted.waveform)
    if wanted.rig is not None:
        found = [one for one in found if one.row["rig"] == wanted.rig]
    if wanted.standard is not None:
        with record.reading() as connection:
            names = Names(connection)
            names.row_id("standards", wanted.standard)  # one that isn't known is refused
            label = names.spelled("standards", wanted.standard)
        found = [one for one in found if one.row["standard"] == label]
    _refuse_mixture(found)
    by_rig: dict[str, list[Plotted]] = defaultdict(list)
    for one, value in _relative(found, quantity):
        by_rig[one.row["rig"] or "unnamed rig"].append(Plotted(one.calibration, one.electrode, one.at, value))
    several = len({one.electrode for one in found}) > 1
    unit = "of the probe's own mean" if several else _unit(quantity)
    enough = {name: points for name, points in by_rig.items() if len(points) >= FEWEST}
    if not enough:
        most = max(map(len, by_rig.values()), default=0)
        raise DataError(
            f"{counted(most, 'reading')} of {quantity} on one rig: too few for a control chart; "
            f"{FEWEST} or more are needed",
            "measure the check probe on every rig, at the beginning of each day",
        )
    left = [
        f"{counted(len(by_rig[name]), 'reading')} on {name}: too few for a chart"
        for name in by_rig
        if name not in enough
    ]
    return [
        _charted(name, str(quantity), unit, points, wanted.baseline, left) for name, points in sorted(enough.items())
    ]


def _charted(
    rig: str, what: str, unit: str, points: Sequence[Plotted], baseline: int | None, left: Sequence[str]
) -> Controlled:
    values = [point.value for point in points]
    base = len(values) if baseline is None else baseline
    if not FEWEST <= base <= len(values):
        raise InputError(f"baseline: {base} of {len(values)} readings; accepted: {FEWEST} to {len(values)}")
    single, ranges = charts.individuals(values, base), charts.moving_range(values, base)
    sd = (float(single.upper[0]) - single.centre) / 3
    if not sd > 0:
        raise DataError(f"the first {base} readings on {rig} are all alike: limits can't be had from them")
    smoothed, sums = charts.ewma(values, single.centre, sd), charts.cusum(values, single.centre, sd)
    signals = sorted({*single.signals, *ranges.signals, *smoothed.signals, *sums.signals})
    return Controlled(
        rig,
        what,
        unit,
        tuple(points),
        base,
        single,
        ranges,
        smoothed,
        sums,
        tuple(signals),
        (*left, *_wear(base, values)),
    )


def _wear(baseline: int, values: Sequence[float]) -> list[str]:
    return [] if baseline < len(values) else ["the limits rest on all readings; --baseline sets them by the first ones"]


def _relative(found: Sequence[Reading], quantity: Quantity) -> list[tuple[Reading, float]]:
    """Values as they are for one probe, as shares of each probe's own mean for several."""
    known = [(one, value) for one in found if (value := _value(one, quantity)) is not None]
    labels = {one.electrode for one, _ in known}
    if len(labels) < 2:
        return known
    if quantity in (Quantity.OXIDATION, Quantity.REDUCTION):
        raise InputError("a potential is no share of its mean; accepted: one probe at a time")
    own: dict[str, list[float]] = defaultdict(list)
    for one, value in known:
        own[one.electrode].append(value)
    mean = {label: sum(values) / len(values) for label, values in own.items()}
    return [(one, value / mean[one.electrode]) for one, value in known if mean[one.electrode]]


def _value(reading: Reading, quantity: Quantity) -> float | None:
    if quantity is Quantity.SENSITIVITY:
        value = reading.figures.sensitivity_na_um
    else:
        value = reading.row[_COLUMNS[quantity][0]]
    return value if value is not None and math.isfinite(value) else None


def _unit(quantity: Quantity) -> str:
    return "nA/µM" if quantity is Quantity.SENSITIVITY else _COLUMNS[quantity][1]


def _refuse_mixture(found: Sequence[Reading]) -> None:
    assays = {(one.analyte, one.waveform) for one in found}
    if len(assays) > 1:
        said = "; ".join(f"{analyte} with {waveform}" for analyte, waveform in sorted(assays))
        raise InputError(f"a chart holds one analyte and waveform; found {said}", "choose with -a and -w")
