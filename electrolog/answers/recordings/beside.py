"""A probe's papers beside a recording in CSV, NPY or HDF5."""

from __future__ import annotations

from datetime import timedelta, tzinfo

import numpy as np
from numpy.typing import NDArray

from electrolog.answers.converting import Converted
from electrolog.answers.recordings import plain_writing
from electrolog.answers.recordings.candidates import ENCLOSED
from electrolog.answers.recordings.gathered import answer_of, gathered, label_of, listed_of, occasion_of
from electrolog.answers.recordings.plain_labels import labels_in
from electrolog.answers.recordings.run_of import Recorded
from electrolog.answers.recordings.span import ENDINGS, span_s
from electrolog.answers.recordings.told import Told
from electrolog.answers.recordings.wanted import UNITS, Enclosed, Wanted
from electrolog.answers.signal_files import trace_from
from electrolog.errors import InputError
from electrolog.record.store import Record

Floats = NDArray[np.float64]


def beside(record: Record, wanted: Wanted, zone: tzinfo | None) -> Enclosed:
    if wanted.in_place or wanted.series is not None:
        raise InputError(f"{wanted.file.name}: papers lie beside such a file; accepted: --in-place, --series with .nwb")
    place = wanted.out or wanted.file.with_name(f"{wanted.stem}{ENCLOSED}")
    row = listed_of(wanted)
    told = Told(probes=labels_in(place) if wanted.probe is None else ())
    label = label_of(record, wanted, row, told)
    plain_writing.refuse_there(place, label, wanted.again)
    rate_hz = wanted.rate_hz or (None if row is None else row.rate_hz())
    recorded = _recorded(wanted, Told() if row is None else row.told(zone), rate_hz)
    occasion, exposure = occasion_of(record, wanted, label, recorded, None)
    trace = trace_from(wanted.file, rate_hz) if wanted.convert else None
    found, made = gathered(record, wanted, occasion, exposure, recorded, trace)
    series = {} if made is None else _columns(made, wanted.unit)
    ending = ".h5" if wanted.file.suffix.casefold() in ENDINGS[2:] else wanted.file.suffix.casefold()
    plain_writing.write(place, found, series, ending, wanted.again)
    return answer_of(found, plain_writing.folder_of(place, label), tuple(list(series)[2:]), exposure, (), made)


def _recorded(wanted: Wanted, listed: Told, rate_hz: float | None) -> Recorded:
    """The list says when the first sample was taken, `--start` when the file's time is zero."""
    first_s, last_s = (0.0, listed.duration_s) if listed.duration_s is not None else span_s(wanted.file, rate_hz)
    before = timedelta(seconds=first_s)
    if wanted.start is not None:
        return Recorded(wanted.start + before, last_s - first_s, wanted.start)
    zero = None if listed.start is None else listed.start - before
    return Recorded(listed.start, last_s - first_s, zero)


def _columns(made: Converted, unit: str) -> dict[str, Floats]:
    _, short, factor = UNITS[unit]
    return {
        "time_s": made.time_s,
        "current_na": made.current_na,
        f"concentration_{short}": made.concentration_um * factor,
        f"low_{short}": made.low_um * factor,
        f"high_{short}": made.high_um * factor,
    }
