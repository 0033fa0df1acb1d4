"""The last entry once more, for another probe: what a day at the bench is made of."""

from __future__ import annotations

from collections.abc import Sequence
from datetime import tzinfo

from electrolog.answers.entering import Entered, log
from electrolog.errors import InputError
from electrolog.record.columns import Value
from electrolog.record.last_entry import last_entry
from electrolog.record.sheets import CALIBRATIONS
from electrolog.record.store import Record

# Of a calibration only what holds for the next probe too; what was measured is the probe's own.
SHARED = ("stage", "analyte", "waveform", "medium", "temperature_c", "standard", "rig", "by")


def again(
    record: Record,
    labels: Sequence[str],
    points: Sequence[tuple[float, float]],
    at: str | None,
    zone: tzinfo | None,
    confirmed: bool,
) -> list[Entered]:
    """Logs for other probes what the same person logged last, now or `at`; an exposure where nothing is said: at the
    same time, as two probes in one preparation. Raises InputError where there is nothing to repeat, or where points
    are missing or out of place.
    """
    with record.reading() as connection:
        found = last_entry(connection, record.who)
    if found is None:
        raise InputError(f"{record.who} has logged nothing yet that could be repeated; accepted: an entry first")
    sheet, row = found
    if sheet is CALIBRATIONS:
        return _calibrated(record, labels, points, {name: row[name] for name in SHARED}, at, zone, confirmed)
    if points:
        raise InputError(f"the last entry is a {sheet.one}, which takes no points; accepted: probes alone")
    values: dict[str, str | Value] = {column.name: row[column.name] for column in sheet.columns}
    time = sheet.time_column or "at"
    values[time] = at or ("now" if time == "at" else row[time])
    return log(record, sheet, values, labels, zone, confirmed)


def _calibrated(
    record: Record,
    labels: Sequence[str],
    points: Sequence[tuple[float, float]],
    shared: dict[str, Value],
    at: str | None,
    zone: tzinfo | None,
    confirmed: bool,
) -> list[Entered]:
    from electrolog.answers.calibrating import NewCalibration, log_calibrations

    if not points:
        raise InputError(
            "the last entry is a calibration, whose points are each probe's own; accepted: its points",
            "such as: electrolog again B9-02 0:0.1 0.5uM:6.1 1uM:12.2",
        )
    values = {**shared, "at": at or "now", "electrode": ",".join(labels)}
    return log_calibrations(record, [NewCalibration(values, tuple(points))], zone, confirmed)
