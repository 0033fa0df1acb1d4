"""A recording's points logged as a calibration, with all that was found in it and every choice that led there."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import replace
from datetime import tzinfo

from electrolog.answers.calibrating import NewCalibration, log_calibrations
from electrolog.answers.entering import Entered
from electrolog.answers.handling import Handling, with_handling
from electrolog.answers.history import usual_waveform
from electrolog.answers.signals import Recorded
from electrolog.errors import DoubtfulEntry
from electrolog.record.columns import Value
from electrolog.record.store import Record


def log_recorded(
    record: Record,
    recorded: Recorded,
    values: Mapping[str, str | Value | None],
    handling: Handling,
    zone: tzinfo | None,
    confirmed: bool,
) -> Entered:
    """`values`: the calibration's columns; a waveform left out is the probe's usual one. Raises DoubtfulEntry."""
    if recorded.doubts and not confirmed:
        raise DoubtfulEntry("; ".join(recorded.doubts), recorded.doubts, "if it is right, repeat it with --yes")
    known = {name: value for name, value in values.items() if value is not None}
    known["waveform"] = known.get("waveform") or usual_waveform(record, str(known["electrode"]), str(known["analyte"]))
    note = known.get("note")
    kept = with_handling(str(note) if note else None, replace(handling, signal=recorded.account))
    new = NewCalibration({**recorded.columns, **known, "note": kept}, recorded.points)
    return log_calibrations(record, [new], zone, confirmed)[0]
