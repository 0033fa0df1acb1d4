"""Opening a recording in the open NWB format (Neurodata Without Borders), and what it says of itself."""

from __future__ import annotations

import warnings
from collections.abc import Iterator
from contextlib import contextmanager
from dataclasses import dataclass
from datetime import datetime, timedelta, tzinfo
from pathlib import Path
from typing import Any

import numpy as np

from electrolog.answers.recordings.told import Told
from electrolog.clock import parse_iso, shown_moment
from electrolog.errors import InputError, shortened

MODULE = "electrolog_"  # begins the name of the group that we put into a file, one for each probe
TABLE, LABEL = "electrode", "electrode"
ORIGIN, SHA256 = "origin", "recording_sha256"
# Stored values are currents after the series' own conversion and offset; NWB's unit of current is amperes.
NANOAMPERES = {
    **dict.fromkeys(("amperes", "ampere", "amps", "amp", "a"), 1e9),
    **dict.fromkeys(("milliamperes", "milliamps", "ma"), 1e6),
    **dict.fromkeys(("microamperes", "microamps", "ua", "µa"), 1e3),
    **dict.fromkeys(("nanoamperes", "nanoamps", "na"), 1.0),
    **dict.fromkeys(("picoamperes", "picoamps", "pa"), 1e-3),
}
SAME = timedelta(seconds=1)
_TIMES = ("timestamps_reference_time", "session_start_time")  # the first, where it is there, is what time zero means


@dataclass(frozen=True)
class Opened:
    """A file under pynwb: `file` is its NWBFile, `io` what writes it back."""

    io: Any
    file: Any


@contextmanager
def opened(path: Path, mode: str = "r") -> Iterator[Opened]:
    """Raises InputError, naming the file, for whatever can't be read as NWB."""
    _refuse_no_file(path)
    io_of = _pynwb(path).NWBHDF5IO
    with warnings.catch_warnings():
        warnings.simplefilter("ignore")  # what other programs left out; nothing that the person at the rig can mend
        io = None
        try:
            io = io_of(str(path), mode)
            file = io.read()
        except Exception as why:  # damaged bytes end in any error at all, from deep inside the libraries
            if io is not None:
                io.close()
            raise _unreadable(path, why) from None
        with io:
            yield Opened(io, file)


def _pynwb(path: Path) -> Any:
    try:
        import pynwb
    except ModuleNotFoundError as why:
        raise InputError(
            f"{path.name}: reading NWB needs {why.name}, which isn't installed",
            'install it with: python -m pip install "electrolog[nwb]", or python -m pip install pynwb',
        ) from None
    return pynwb


def _refuse_no_file(path: Path) -> None:
    if path.is_dir():
        raise InputError(f"{path.name}: is a folder; accepted: an NWB file in HDF5, which is one file")
    if not path.is_file():
        raise InputError(f"{path.name}: there is no such file")


def _unreadable(path: Path, why: Exception) -> InputError:
    said = str(why)
    if "truncated file" in said:
        return InputError(f"{path.name}: is cut short ({path.stat().st_size} bytes)", "copy it from the rig once more")
    if "signature not found" in said:
        return InputError(f"{path.name}: is no HDF5 file, whatever its name says; accepted: NWB in HDF5")
    if "unable to lock file" in said:
        return InputError(f"{path.name}: another program has it open", "wait until it is closed there")
    if "Missing NWB version" in said:
        return InputError(f"{path.name}: is HDF5, but nothing in it is NWB; accepted: NWB in HDF5")
    return InputError(
        f"{path.name}: can't be read as NWB ({type(why).__name__}: {shortened(said, 120)})",
        "is it whole? a newer pynwb may know a newer file",
    )


@dataclass(frozen=True)
class Began:
    """When a file's time is zero; `zone_assumed`: it gives no offset, so that the zone is ours and not its own."""

    moment: datetime
    zone_assumed: bool


def began(path: Path, zone: tzinfo | None) -> Began:
    """Read as the file spells it: pynwb would put the machine's zone in without a word. Raises InputError."""
    _refuse_no_file(path)
    _pynwb(path)
    import h5py

    try:
        with h5py.File(path, "r") as file:
            found = [file[name][()] for name in _TIMES if name in file]
            is_nwb = "nwb_version" in file.attrs
    except Exception as why:
        raise _unreadable(path, why) from None
    if not is_nwb:
        raise _unreadable(path, TypeError("Missing NWB version"))
    texts = [one.decode("utf-8", "replace") if isinstance(one, bytes) else str(one) for one in found]
    text = next((text.strip() for text in texts if text.strip()), "")
    if not text:
        raise InputError(f"{path.name}: says no start time; accepted: session_start_time, or a start in the list")
    try:
        moment = parse_iso(text, zone, "start")
        return Began(moment, datetime.fromisoformat(text).tzinfo is None)
    except InputError as why:
        raise InputError(f"{path.name}: {why.message}", why.hint) from None


def told_by(path: Path, zone: tzinfo | None, listed: Told) -> Told:
    """What an NWB file says of its run, with what a list says in its place; where the two differ, it is said.

    Raises InputError where it can't be read, or has no start or no length.
    """
    own = _began(path, zone, listed)
    with opened(path) as one:
        first_s, last_s, said = _span(path, one.file)
        subject = (one.file.subject.subject_id if one.file.subject is not None else None) or None
        start = own.moment + timedelta(seconds=first_s) if own else None
        return Told(
            start=listed.start or start,
            duration_s=listed.duration_s or last_s - first_s,
            first_s=first_s,
            subject=listed.subject or subject,
            probes=own_labels(one.file),
            devices=_devices(one.file),
            sha256=_first_sha256(one.file),
            zone_assumed=listed.zone_assumed or bool(own and own.zone_assumed and not listed.start),
            said=(*said, *_differing(listed, start, subject, zone)),
        )


def _began(path: Path, zone: tzinfo | None, listed: Told) -> Began | None:
    try:
        return began(path, zone)
    except InputError:
        if listed.start is None:
            raise
        return None


def _differing(listed: Told, start: datetime | None, subject: str | None, zone: tzinfo | None) -> list[str]:
    said = []
    if listed.start and start and abs(listed.start - start) > SAME:
        said.append(f"its start is the list's; the file says {shown_moment(start, zone)}")
    if listed.subject and subject and listed.subject != subject:
        said.append(f"its subject is the list's; the file says {shortened(subject, 40)}")
    return said


def own_labels(file: Any) -> tuple[str, ...]:
    """The probes whose papers are in the file."""
    tables = [module.data_interfaces.get(TABLE) for module in own_modules(file)]
    return tuple(str(label) for table in tables if table is not None for label in table[LABEL].data[:])


def _first_sha256(file: Any) -> str | None:
    tables = [module.data_interfaces.get(ORIGIN) for module in own_modules(file)]
    return next((str(table[SHA256].data[0]) for table in tables if table is not None), None)


def own_modules(file: Any) -> list[Any]:
    return [module for name, module in file.processing.items() if name.startswith(MODULE)]


def _devices(file: Any) -> tuple[str, ...]:
    """Whatever may be a probe's label: names and serial numbers of devices, names of electrodes."""
    devices = file.devices.values()
    found = [*file.devices, *(one.serial_number for one in devices), *(file.icephys_electrodes or {})]
    return tuple(dict.fromkeys(str(name) for name in found if name))


def current_factor(series: Any) -> float | None:
    """From the series' own unit into nA; None where it isn't one of current."""
    return NANOAMPERES.get(str(series.unit).strip().casefold())


def recorded(file: Any) -> list[Any]:
    """The time series among what was acquired."""
    found = [[one] if hasattr(one, "rate") else list(_inside(one)) for one in file.acquisition.values()]
    return [one for group in found for one in group]


def _inside(container: Any) -> Iterator[Any]:
    return (one for one in getattr(container, "time_series", {}).values() if hasattr(one, "rate"))


def _span(path: Path, file: Any) -> tuple[float, float, tuple[str, ...]]:
    """First and last second that was recorded: of the currents, where there are any."""
    every = recorded(file)
    currents = [one for one in every if current_factor(one) is not None]
    spans = [span for one in currents or every if (span := _span_of(one)) is not None]
    if not spans:
        names = ", ".join(shortened(one.name, 40) for one in every) or "none"
        raise InputError(f"{path.name}: no series says how long it was; time series acquired: {names}")
    said = () if currents else ("no series in amperes: its length is that of everything recorded",)
    return min(first for first, _ in spans), max(last for _, last in spans), said


def _span_of(series: Any) -> tuple[float, float] | None:
    samples = series.data.shape[0] if getattr(series.data, "shape", None) else 0
    if not samples:
        return None
    if series.timestamps is not None and len(series.timestamps):
        first, last = float(series.timestamps[0]), float(series.timestamps[-1])
    elif series.rate and series.rate > 0:
        first = float(series.starting_time or 0.0)
        last = first + (samples - 1) / float(series.rate)
    else:
        return None
    return (first, last) if np.isfinite([first, last]).all() else None
