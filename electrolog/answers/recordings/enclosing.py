"""A probe's papers put into a recording in NWB, or beside a plain one, with its currents as concentrations if asked."""

from __future__ import annotations

from datetime import tzinfo

from electrolog.answers.recordings.beside import beside
from electrolog.answers.recordings.into_nwb import into_nwb
from electrolog.answers.recordings.span import ENDINGS
from electrolog.answers.recordings.wanted import UNITS, Enclosed, Wanted
from electrolog.errors import InputError, shortened
from electrolog.record.store import Record


def enclosed(record: Record, wanted: Wanted, zone: tzinfo | None) -> Enclosed:
    """Raises InputError, UnknownName or DataError, and then nothing is written; the recording itself never changes
    unless `in_place`, and then in one step.
    """
    if wanted.unit not in UNITS:
        raise InputError(f"unit: '{shortened(wanted.unit)}' is none for a concentration; accepted: {', '.join(UNITS)}")
    if wanted.series is not None and not wanted.convert:
        raise InputError("a series is named, but nothing is to be converted; accepted: --convert with --series")
    if not wanted.file.is_file():
        raise InputError(f"{wanted.file.name}: there is no such file")
    ending = wanted.file.suffix.casefold()
    if ending == ".nwb":
        return into_nwb(record, wanted, zone)
    if ending in ENDINGS:
        return beside(record, wanted, zone)
    raise InputError(f"'{shortened(ending, 20)}' is no kind of recording; accepted: .nwb, {', '.join(ENDINGS)}")
