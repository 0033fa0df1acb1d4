"""A probe's papers into a recording in NWB: a new copy, an earlier copy of ours, or in place when asked."""

from __future__ import annotations

from datetime import timedelta, tzinfo
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from electrolog.answers.converting import Converted
from electrolog.answers.recordings import nwb, nwb_series, nwb_writing
from electrolog.answers.recordings.candidates import ENCLOSED
from electrolog.answers.recordings.gathered import answer_of, gathered, label_of, listed_of, occasion_of
from electrolog.answers.recordings.papers import Occasion
from electrolog.answers.recordings.run_of import Recorded
from electrolog.answers.recordings.told import Told
from electrolog.answers.recordings.wanted import UNITS, Enclosed, Wanted
from electrolog.answers.recordings.working_copy import refuse_read_only
from electrolog.errors import InputError
from electrolog.record.store import Record

Floats = NDArray[np.float64]


def into_nwb(record: Record, wanted: Wanted, zone: tzinfo | None) -> Enclosed:
    row = listed_of(wanted)
    told = nwb.told_by(wanted.file, zone, Told() if row is None else row.told(zone))
    label = label_of(record, wanted, row, told)
    target = _target(wanted)
    base = _base(wanted, target, label)
    assert told.start is not None  # noqa: S101 -- told_by refuses a file without one
    recorded = Recorded(told.start, told.duration_s, told.start - timedelta(seconds=told.first_s))
    occasion, exposure = occasion_of(record, wanted, label, recorded, told.sha256)
    place, trace = _current(wanted) if wanted.convert else ("", None)
    found, made = gathered(record, wanted, occasion, exposure, recorded, trace)
    series = None if made is None else _series(place, made, occasion, wanted.unit)
    said = (*told.said, *nwb_writing.write(base, target, found, series, replace=base == target))
    name = f"concentration_{place.rpartition('/')[2]}"
    names = () if series is None else (name, f"{name}_low", f"{name}_high")
    return answer_of(found, target, names, exposure, said, made)


def _target(wanted: Wanted) -> Path:
    if wanted.in_place:
        if wanted.out is not None:
            raise InputError("in place and --out can't both be; accepted: one of them")
        refuse_read_only(wanted.file)
        return wanted.file.resolve()  # a link keeps leading to it
    target = wanted.out or wanted.file.with_name(f"{wanted.stem}{ENCLOSED}.nwb")
    if target.exists() and target.samefile(wanted.file):
        raise InputError(f"{target.name}: is the recording itself", "--in-place if it is to be put into this very file")
    if not target.parent.is_dir():
        raise InputError(f"{target.parent}: there is no such folder")
    return target


def _base(wanted: Wanted, target: Path, label: str) -> Path:
    """The file that the papers go into a copy of: an earlier copy of this recording is added to, never overwritten."""
    base = target if target.exists() else wanted.file
    with nwb.opened(base) as one:
        there = nwb_writing.holds(one.file, label)
        is_ours, identifier = bool(nwb.own_modules(one.file)), one.file.identifier
    if there and not wanted.again:
        hint = "--again puts new ones in their place"
        raise InputError(f"{base.name}: the papers of {label} are in it already", hint)
    if base == target and not wanted.in_place:
        with nwb.opened(wanted.file) as one:
            if not is_ours or one.file.identifier != identifier:
                raise InputError(f"{target.name} is there already, and is no copy of ours", "name another with --out")
    return base


def _current(wanted: Wanted) -> tuple[str, tuple[Floats, Floats]]:
    with nwb.opened(wanted.file) as one:
        place, series = nwb_series.chosen(wanted.file, one.file, wanted.series)
        return place, nwb_series.trace_of(series)


def _series(place: str, made: Converted, occasion: Occasion, unit: str) -> nwb_writing.Series:
    word, _, factor = UNITS[unit]
    start, end = made.sensitivity_start.median, made.sensitivity_end.median
    about = (
        f"the concentration of {occasion.analyte}, from the current '{place}' by the sensitivity of {occasion.label} at"
        f" each moment of the run: {start:.3g} nA/µM at its start, {end:.3g} at its end; the band from 5 % to 95 %"
        " holds what is unknown of sensitivity, background and noise"
    )
    arrays = (made.concentration_um, made.low_um, made.high_um)
    return nwb_writing.Series(place, word, about, *(values * factor for values in arrays))
