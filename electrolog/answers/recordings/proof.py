"""The proof that a copy holds all that its source holds, bit by bit, but for the part that is ours."""

from __future__ import annotations

from collections.abc import Collection, Iterator
from pathlib import Path
from typing import Any

import numpy as np

from electrolog.errors import ElectrologError

STRETCH_BYTES = 64_000_000
FORMAT = "nwb_version"  # of the whole file; the format's library sets it to the one that it writes


def refuse_unequal(source: Path, copy: Path, ours: Collection[str]) -> None:
    """`ours`: paths in the file, without the leading slash. Raises ElectrologError naming the first difference."""
    import h5py

    with h5py.File(source, "r") as old, h5py.File(copy, "r") as new:
        for name, one in _objects(old):
            if _is_within(name, ours):
                continue
            other = new.get(name)
            if other is None or not _alike(old, new, one, other):
                raise ElectrologError(
                    f"{source.name}: what is at {name} would not be the same afterwards; nothing was put in",
                    "please report it; the recording is as it was",
                )
        _refuse_lost_links(old, new, ours, source.name)


def _objects(file: Any) -> Iterator[tuple[str, Any]]:
    names: list[str] = []
    file.visit(names.append)
    yield "/", file["/"]
    for name in names:
        yield name, file[name]


def _is_within(name: str, ours: Collection[str]) -> bool:
    return any(name == own or name.startswith(f"{own}/") for own in ours)


def _alike(old: Any, new: Any, one: Any, other: Any) -> bool:
    if type(one) is not type(other) or set(one.attrs) != set(other.attrs):
        return False
    told = [key for key in one.attrs if (one.name, key) != ("/", FORMAT)]
    if any(_plain(old, one.attrs[key]) != _plain(new, other.attrs[key]) for key in told):
        return False
    if not hasattr(one, "dtype"):
        return True
    if (one.dtype, one.shape) != (other.dtype, other.shape):
        return False
    return all(_plain(old, a) == _plain(new, b) for a, b in zip(_stretches(one), _stretches(other), strict=True))


def _stretches(dataset: Any) -> Iterator[Any]:
    """As stored where it lies in chunks, which needs no filter to be there; else in stretches of rows."""
    if dataset.chunks and not dataset.dtype.hasobject:
        for place in range(dataset.id.get_num_chunks()):
            info = dataset.id.get_chunk_info(place)
            yield info.chunk_offset, dataset.id.read_direct_chunk(info.chunk_offset)
    elif not dataset.shape:
        yield dataset[()]
    else:
        row = max(1, int(np.prod(dataset.shape[1:])) * dataset.dtype.itemsize)
        step = max(1, STRETCH_BYTES // row)
        for start in range(0, dataset.shape[0], step):
            yield dataset[start : start + step]


def _plain(file: Any, value: Any) -> Any:
    """As what == compares rightly: bytes for numbers (NaN is NaN), names for references."""
    import h5py

    if isinstance(value, h5py.Reference):
        return file[value].name if value else ""
    if isinstance(value, np.ndarray | np.generic) and not value.dtype.hasobject:
        return str(value.dtype), value.shape, value.tobytes()
    if isinstance(value, np.void):
        return [_plain(file, value[name]) for name in value.dtype.names or ()]
    if isinstance(value, tuple | list):
        return [_plain(file, part) for part in value]
    if isinstance(value, np.ndarray):
        return [_plain(file, part) for part in value.reshape(-1)]
    return value


def _refuse_lost_links(old: Any, new: Any, ours: Collection[str], name: str) -> None:
    """A soft link that led somewhere must still lead there, into our part too."""
    import h5py

    links: list[str] = []
    old.visit_links(links.append)
    for place in links:
        if _is_within(place, ours) or not isinstance(old.get(place, getlink=True), h5py.SoftLink):
            continue
        if old.get(place) is not None and new.get(place) is None:
            raise ElectrologError(f"{name}: the link /{place} would lead nowhere afterwards; nothing was put in")
