"""The sensitivity history: every calibration with what it says, and what the probe had been through by then."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from datetime import datetime
from typing import Any

from electrolog.answers import figures as made
from electrolog.answers import health
from electrolog.answers import life as lives
from electrolog.answers.answer import Answer
from electrolog.answers.carbon import Carbon, carbon_at
from electrolog.answers.handling import Handling, split
from electrolog.errors import InputError, shortened
from electrolog.measure.calibrate import CalibrationFigures
from electrolog.measure.geometry import Specific, area_um2, per_area, per_length
from electrolog.measure.recording import once_negative
from electrolog.record import queries, sheets
from electrolog.record.names import Names
from electrolog.record.queries import Calibration, Event
from electrolog.record.readable import Row
from electrolog.record.store import Record


@dataclass(frozen=True)
class Reading(Answer):
    """One calibration of a probe. `share_left` is of the reference calibration; its error is of both readings."""

    electrode: str
    calibration: str
    at: datetime
    stage: str
    analyte: str
    waveform: str
    figures: CalibrationFigures
    row: dict[str, Any]
    points: tuple[tuple[float, float], ...]
    exposure_h: dict[str, float]
    share_left: float | None
    share_left_se: float | None
    is_reference: bool
    handling: Handling
    specific: tuple[Specific, ...]
    warnings: tuple[str, ...]


def readings(
    record: Record,
    labels: Sequence[str],
    analyte: str | None = None,
    waveform: str | None = None,
    expected_um: tuple[float, float] | None = None,
) -> list[Reading]:
    """Calibrations of the named probes, oldest first; of one analyte or waveform if named. Raises UnknownName.

    expected_um: the lowest and highest concentration that a recording is expected to hold.
    """
    with record.reading() as connection:
        names = Names(connection)
        wanted_analyte = None if analyte is None else names.row_id("analytes", analyte)
        wanted_waveform = None if waveform is None else names.row_id("waveforms", waveform)
        probes = queries.probes(connection, labels)
        must_be_known(names, labels, probes)
        ids = [probe["id"] for probe in probes]
        found = queries.calibrations(connection, ids, wanted_analyte, wanted_waveform)
        life = queries.events(connection, ids)
    numbers = made.all_figures(record, found)
    said = health.warnings(record, found, numbers, expected_um)
    by_label = {probe["electrode"]: probe for probe in probes}
    return [
        _reading(one, by_label[one.row["electrode"]], life[one.row["electrode"]], numbers, said.get(one.row["id"], ()))
        for one in found
    ]


def must_be_known(names: Names, labels: Sequence[str], probes: Sequence[Row]) -> None:
    """Raises UnknownName for a label without a probe: an answer that leaves one out looks like one about all."""
    found = {probe["electrode"] for probe in probes}
    for label in labels:
        if label not in found:
            names.row_id("electrodes", label)


def readings_of(record: Record, calibrations: Sequence[str]) -> list[Reading]:
    """The named calibrations, in the order of time. Raises UnknownName."""
    with record.reading() as connection:
        names = Names(connection)
        ids = [names.row_id("calibrations", name) for name in calibrations]
        found = queries.calibrations_by_id(connection, ids)
    labels = list(dict.fromkeys(one.row["electrode"] for one in found))
    return [one for one in readings(record, labels) if one.row["id"] in ids] if labels else []


def usual_waveform(record: Record, label: str, analyte: str) -> str:
    """The waveform of the probe's last calibration with this analyte. Raises InputError if there is none."""
    with record.reading() as connection:
        names = Names(connection)
        ids = [names.row_id("electrodes", label)]
        found = queries.calibrations(connection, ids, names.row_id("analytes", analyte))
        known = [name for name, _ in names.everything("waveforms").values()]
    if not found:
        raise InputError(
            f"waveform: missing, and '{shortened(label)}' was never calibrated with {shortened(analyte)};"
            f" known waveforms: {', '.join(known)}"
        )
    return str(found[-1].row["waveform"])


def _reading(
    calibration: Calibration,
    probe: Row,
    life: list[Event],
    numbers: dict[int, CalibrationFigures],
    health_warnings: Sequence[str],
) -> Reading:
    row = calibration.row
    _, handling = split(row["note"])
    own = numbers[row["id"]]
    first = lives.reference(life, row["analyte"], row["waveform"], calibration.at)
    share, share_se = share_of(own, numbers[first.row["id"]]) if first else (None, None)
    is_reference = bool(first) and first is not None and first.row["id"] == row["id"]
    return Reading(
        electrode=row["electrode"],
        calibration=row["calibration"],
        at=calibration.at,
        stage=row["stage"],
        analyte=row["analyte"],
        waveform=row["waveform"],
        figures=own,
        row=row,
        points=calibration.points,
        exposure_h=lives.exposure_h(life, calibration.at),
        share_left=share,
        share_left_se=None if is_reference else share_se,
        is_reference=is_reference,
        handling=handling,
        specific=_per_size(own, carbon_at(probe, life, calibration.at)),
        warnings=once_negative(
            (*_said_of_signal(handling), *own.warnings, *_said_of_order(calibration, life), *health_warnings)
        ),
    )


def _per_size(own: CalibrationFigures, carbon: Carbon) -> tuple[Specific, ...]:
    """Per exposed length and per area, where the probe's size was known at that time."""
    if own.sensitivity_na_um is None:
        return ()
    sized = []
    if carbon.geometry == "cylinder" and carbon.exposed_length_um:
        sized.append(per_length(own.sensitivity_na_um, own.sensitivity_se_na_um, carbon.exposed_length_um))
    area = area_um2(carbon.geometry, carbon.diameter_um, carbon.exposed_length_um)
    if area:
        sized.append(per_area(own.sensitivity_na_um, own.sensitivity_se_na_um, area))
    return tuple(sized)


def _said_of_signal(handling: Handling) -> list[str]:
    said = (handling.signal or {}).get("warnings", [])
    return [str(text) for text in said] if isinstance(said, list) else []


def share_of(now: CalibrationFigures, reference: CalibrationFigures) -> tuple[float | None, float | None]:
    """Ratio of two sensitivities and its standard error by propagation of both relative errors."""
    top, bottom, lowest = now.sensitivity_na_um, reference.sensitivity_na_um, reference.sensitivity_low_na_um
    if top is None or not bottom or bottom <= 0 or (lowest is not None and lowest <= 0):
        return None, None  # of a reference that can't be told from zero nothing can be a share
    top_se, bottom_se = now.sensitivity_se_na_um, reference.sensitivity_se_na_um
    if top_se is None or bottom_se is None:
        return top / bottom, None
    return top / bottom, math.hypot(top_se / bottom, top * bottom_se / bottom**2)


def _said_of_order(calibration: Calibration, life: list[Event]) -> list[str]:
    """A cleaning between a run and its post-calibration hides the loss that the calibration was to measure."""
    if calibration.row["stage"] != "post":
        return []
    before = [event for event in lives.until(life, calibration.at) if event.sheet is not sheets.CALIBRATIONS]
    runs = [lives.end_of(event) for event in before if event.sheet is sheets.EXPOSURES]
    if not runs:
        return ["a post-calibration without a logged run before it: the exposure behind it is unknown"]
    since = [event for event in before if event.sheet in lives.RENEWING and event.at >= max(runs)]
    return [
        f"a {event.sheet.one} stands between the run and this post-calibration: the run's own loss is hidden by it"
        for event in since
    ]
