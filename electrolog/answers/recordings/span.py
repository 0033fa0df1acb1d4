"""How long a recording in CSV, NPY or HDF5 lasted; of a large file only its ends are read."""

from __future__ import annotations

from pathlib import Path
from typing import Any

from electrolog.answers import signal_files as files
from electrolog.errors import InputError, shortened

ENDINGS = (".csv", ".npy", ".h5", ".hdf5", ".hdf")
END_BYTES = 1_000_000  # holds the last row of any sheet of scans


def span_s(path: Path, rate_hz: float | None = None) -> tuple[float, float]:
    """First and last second of its own clock. `rate_hz`: of a file that holds currents alone. Raises InputError."""
    with files.said_of(path):
        readers = {".csv": _csv, ".npy": _npy, ".h5": _hdf}
        first, last = files.by_ending(path, readers)(path, rate_hz)
        return float(first), float(last)


def _csv(path: Path, _: float | None) -> tuple[float, float]:
    names = [name.casefold() for name in files.header_of(path)]
    found = [name for name in files.SECONDS if name in names]
    if len(found) != 1:
        raise InputError(f"has no time; accepted: one of {', '.join(files.SECONDS)}")
    place, factor = names.index(found[0]), files.SECONDS[found[0]]
    with path.open("rb") as file:
        header, first = file.readline(), file.readline()
        mark = files.separator_of(header.decode("utf-8", "replace")).encode()
        size = path.stat().st_size
        file.seek(max(len(header), size - END_BYTES))
        rows = [row for row in file.read().splitlines() if row.strip()]
    if not first.strip() or not rows:
        raise InputError("has no row below its names; accepted: one for each sample")
    return _cell(first, mark, place) * factor, _cell(rows[-1], mark, place) * factor


def _cell(row: bytes, mark: bytes, place: int) -> float:
    cells = row.split(mark)
    text = cells[place].decode("utf-8", "replace").strip().strip('"') if place < len(cells) else ""
    try:
        return float(text)
    except ValueError:
        raise InputError(
            f"its time '{shortened(text)}' is no number; accepted: numbers with . as decimal mark"
        ) from None


def _npy(path: Path, rate_hz: float | None) -> tuple[float, float]:
    found = files.mapped(path)
    if not len(found):
        raise InputError("holds no sample")
    if found.dtype.names:
        return _of_columns({name.casefold(): found[name] for name in found.dtype.names}, len(found), rate_hz)
    if found.ndim == 2 and 2 in found.shape:
        time = found[:, 0] if found.shape[1] == 2 else found[0]
        return time[0], time[-1]
    return _by_rate(len(found), rate_hz)


def _hdf(path: Path, rate_hz: float | None) -> tuple[float, float]:
    with files.datasets(path) as found:
        samples = next((len(found[name]) for name in files.NANOAMPERES if name in found), 0)
        return _of_columns(found, samples, rate_hz)


def _of_columns(table: Any, samples: int, rate_hz: float | None) -> tuple[float, float]:
    for name, factor in files.SECONDS.items():
        if name in table and len(table[name]):
            return table[name][0] * factor, table[name][len(table[name]) - 1] * factor
    return _by_rate(samples, rate_hz)


def _by_rate(samples: int, rate_hz: float | None) -> tuple[float, float]:
    if rate_hz is None:
        raise InputError("holds currents without times; accepted: its rate_hz or its duration_s too")
    return 0.0, (samples - 1) / rate_hz
