"""Recordings as rigs leave them: NWB files by pynwb alone, and plain ones in CSV, NPY and HDF5."""

from __future__ import annotations

import hashlib
from collections.abc import Iterator
from contextlib import contextmanager
from datetime import UTC, datetime
from pathlib import Path
from typing import Any

import h5py
import numpy as np
from pynwb import NWBHDF5IO, NWBFile, TimeSeries
from pynwb.device import Device
from pynwb.file import Subject

BEGAN = datetime(2026, 2, 2, 10, tzinfo=UTC)


def write_nwb(
    path: Path,
    *,
    began: datetime = BEGAN,
    length_s: float = 7200.0,
    rate_hz: float = 0.5,
    subject: str | None = "animal-7",
    serial: str | None = None,
    unit: str = "amperes",
    data: Any = None,
    **series: Any,
) -> Path:
    """A series `current` in amperes, at an even rate unless `timestamps` are given, first sample at its start."""
    path.parent.mkdir(parents=True, exist_ok=True)
    file = NWBFile(
        session_description="an invented run",
        identifier=path.stem,
        session_start_time=began,
        timestamps_reference_time=began,
        experimenter=["Wren, A."],
        institution="an invented lab",
        experiment_description="invented",
        keywords=["invented"],
    )
    if subject is not None:
        said = {"species": "Rattus norvegicus", "sex": "M", "age": "P90D", "description": "invented"}
        file.subject = Subject(subject_id=subject, **said)
    if serial is not None:
        file.add_device(Device(name="electrode in the left side", description="a probe", serial_number=serial))
    samples = round(length_s * rate_hz) + 1 if data is None else len(data)
    if data is None:
        data = np.random.default_rng(3).normal(5e-9, 1e-10, samples).astype(np.float32)
    times = {} if "timestamps" in series else {"starting_time": 0.0, "rate": rate_hz}
    file.add_acquisition(
        TimeSeries(name="current", description="at the peak", data=data, unit=unit, **(times | series))
    )
    with NWBHDF5IO(str(path), "w") as io:
        io.write(file)
    return path


@contextmanager
def patched(path: Path) -> Iterator[h5py.File]:
    """The file's insides, to spoil them."""
    with h5py.File(path, "a") as file:
        yield file


def set_start(path: Path, text: str) -> None:
    with patched(path) as file:
        for name in ("session_start_time", "timestamps_reference_time"):
            del file[name]
            file.create_dataset(name, data=text, dtype=h5py.string_dtype())


def sha256(path: Path) -> str:
    return hashlib.sha256(path.read_bytes()).hexdigest()


def datasets(path: Path) -> dict[str, tuple[Any, ...]]:
    """Every dataset: type, shape, raw bytes, attributes; and every group's attributes."""
    found: dict[str, tuple[Any, ...]] = {}

    def keep(name: str, item: Any) -> None:
        kept = {key: str(value) for key, value in item.attrs.items()}
        if isinstance(item, h5py.Dataset):
            values = item[()]
            raw = values.tobytes() if item.dtype.kind in "fiu" else str(values).encode()
            found[name] = (str(item.dtype), item.shape, raw, kept)
        else:
            found[name] = (kept,)

    with h5py.File(path, "r") as file:
        file.visititems(keep)
    return found
