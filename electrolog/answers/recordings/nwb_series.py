"""Which series of an NWB file is the current to be converted, as seconds and nA."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import numpy as np
from numpy.typing import NDArray

from electrolog.answers.recordings.nwb import MODULE, current_factor, recorded
from electrolog.errors import InputError, shortened
from electrolog.measure.recording import refuse_too_many

Floats = NDArray[np.float64]
MOST_LISTED = 12


def chosen(path: Path, file: Any, name: str | None) -> tuple[str, Any]:
    """Place and series: the named one, or the only current that was acquired at one potential.

    Raises InputError, listing the series there are, for one that isn't there, is no current, or has many columns.
    """
    every = by_place(file)
    if name is not None:
        found = [place for place, one in every.items() if name in (place, one.name)]
        wrong = f"no series is called '{shortened(name)}'" if not found else f"{len(found)} series are called so"
    else:
        found = [one.name for one in recorded(file) if _why_not(one) is None]
        wrong = f"{len(found) or 'none'} of its series could be the current: which is it? --series names one"
    if len(found) != 1:
        raise InputError(f"{path.name}: {wrong}; found: {_listed(every)}")
    why = _why_not(every[found[0]])
    if why is not None:
        raise InputError(f"{path.name}: '{shortened(found[0])}' {why}; found: {_listed(every)}")
    return found[0], every[found[0]]


def trace_of(series: Any) -> tuple[Floats, Floats]:
    """Seconds from the file's time zero and nA, each (samples,): the series' own conversion and offset applied."""
    samples = int(series.data.shape[0])
    refuse_too_many(samples)
    stored = np.asarray(series.data[:], dtype=float).reshape(samples)
    factor = current_factor(series)
    assert factor is not None  # noqa: S101 -- chosen() refuses such a series
    current_na = (stored * float(series.conversion) + float(series.offset or 0.0)) * factor
    if series.timestamps is not None:
        return np.asarray(series.timestamps[:], dtype=float), current_na
    return float(series.starting_time or 0.0) + np.arange(samples) / float(series.rate), current_na


def by_place(file: Any) -> dict[str, Any]:
    """Every time series but our own: what was acquired by its name, what was processed as `module/name`."""
    found = {one.name: one for one in recorded(file)}
    for name, module in file.processing.items():
        if not name.startswith(MODULE):
            found |= {f"{name}/{key}": one for key, one in module.data_interfaces.items() if hasattr(one, "rate")}
    return found


def _why_not(series: Any) -> str | None:
    if current_factor(series) is None:
        return f"is in '{shortened(str(series.unit), 40)}'; accepted: a unit of current, such as amperes or nanoamperes"
    shape: tuple[int, ...] = tuple(getattr(series.data, "shape", ()))
    if len(shape) == 1 or (len(shape) == 2 and shape[1] == 1):
        return None
    return f"has the shape {shape}; accepted: one current for each time, at one potential"


def _listed(every: dict[str, Any]) -> str:
    said = [
        f"{place} ({shortened(str(one.unit), 20)}, {' × '.join(map(str, getattr(one.data, 'shape', ())))})"
        for place, one in every.items()
    ]
    return (", ".join(said[:MOST_LISTED]) or "no series") + (", …" if len(said) > MOST_LISTED else "")
