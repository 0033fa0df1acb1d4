"""A probe's papers put into an NWB file: a processing module of its own, and a device that stands for the probe."""

from __future__ import annotations

import re
from collections.abc import Iterator
from contextlib import contextmanager
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import numpy as np
from numpy.typing import NDArray

from electrolog.answers.recordings.nwb import LABEL, MODULE, TABLE, opened, own_modules
from electrolog.answers.recordings.nwb_series import by_place
from electrolog.answers.recordings.papers import Papers
from electrolog.answers.recordings.proof import FORMAT, refuse_unequal
from electrolog.answers.recordings.tables import Column, Table
from electrolog.answers.recordings.working_copy import working_copy
from electrolog.errors import ElectrologError, InputError, shortened

Floats = NDArray[np.float64]
DEVICE = "microelectrode_"


@dataclass(frozen=True)
class Series:
    """A converted series: concentrations (samples,) with the ends of their band, beside the current it is of."""

    of: str
    unit: str
    about: str
    concentration: Floats
    low: Floats
    high: Floats


def place_of(label: str) -> tuple[str, str]:
    """Names of the probe's module and device; a slash or a colon can't be in one."""
    safe = re.sub(r"[^\w.\-]", "_", label)
    return f"{MODULE}{safe}", f"{DEVICE}{safe}"


def holds(file: Any, label: str) -> bool:
    """Whether the file has papers of this probe. Raises InputError where another probe's stand in their place."""
    module = {one.name: one for one in own_modules(file)}.get(place_of(label)[0])
    if module is None:
        return False
    table = module.data_interfaces.get(TABLE)
    found = str(table[LABEL].data[0]) if table is not None else "?"
    if found != label:
        raise InputError(f"the papers in '{module.name}' are of {found}, whose name in a file is that of {label} too")
    return True


def write(source: Path, target: Path, papers: Papers, series: Series | None, replace: bool) -> tuple[str, ...]:
    """Into a copy of `source`, which then becomes `target`; papers of the same probe in it are replaced.

    Returns what there is to say of it.

    Raises InputError or ElectrologError, both files as they were, unless all else in the copy equals the source.
    """
    module, device = place_of(papers.label)
    if target.parent.resolve() != source.parent.resolve():
        _refuse_left_behind(source)
    more_bytes = 0 if series is None else 3 * series.concentration.nbytes
    with working_copy(source, target, replace, more_bytes) as copy, _whole(source):
        _take_out(copy, module, device)
        with opened(copy, "a") as one:
            _put_in(one.file, papers, series)
            one.io.write(one.file)
        refuse_unequal(source, copy, (f"processing/{module}", f"general/devices/{device}"))
        with opened(copy) as one:
            if not holds(one.file, papers.label):
                raise InputError(f"{target.name}: what was put in can't be read back; nothing was changed")
        return _of_versions(_version(source), _version(copy))


@contextmanager
def _whole(source: Path) -> Iterator[None]:
    """Damaged bytes end in any error at all, from deep inside the libraries; a full disk says itself what it is."""
    try:
        yield
    except ElectrologError:
        raise
    except Exception as why:
        if isinstance(why, OSError) and why.errno:
            raise
        said = f"{type(why).__name__}: {shortened(str(why), 120)}"
        raise InputError(
            f"{source.name}: can't be read to its end ({said}); nothing was put in", "is it whole?"
        ) from None


def _version(path: Path) -> str:
    import h5py

    with h5py.File(path, "r") as file:
        return str(file.attrs[FORMAT])


def _of_versions(before: str, after: str) -> tuple[str, ...]:
    return (
        () if before == after else (f"the file was of NWB {before}, and is of NWB {after} now: pynwb adds in its own",)
    )


def _refuse_left_behind(source: Path) -> None:
    """What a file keeps in others beside it is found from its own folder alone."""
    import h5py

    with h5py.File(source, "r") as file:
        links: list[str] = []
        file.visit_links(links.append)
        elsewhere = [name for name in links if isinstance(file.get(name, getlink=True), h5py.ExternalLink)]
        elsewhere += [name for name in links if name.endswith("/external_file")]
    if elsewhere:
        raise InputError(
            f"{source.name}: /{elsewhere[0]} lies in another file, which a copy in another folder would not find;"
            " accepted: --out in the recording's own folder"
        )


def _take_out(copy: Path, module: str, device: str) -> None:
    """Earlier papers of this probe. Links to them lead to the new ones, which get the same names."""
    import h5py

    with h5py.File(copy, "r+") as file:
        if f"processing/{module}" in file:
            del file[f"processing/{module}"]
            if f"general/devices/{device}" in file:
                del file[f"general/devices/{device}"]


def _put_in(file: Any, papers: Papers, series: Series | None) -> None:
    from pynwb.base import ProcessingModule
    from pynwb.device import Device

    module, device = place_of(papers.label)
    about = papers.description[0].upper() + papers.description[1:]
    if device not in file.devices:
        file.add_device(Device(name=device, description=about, serial_number=papers.label))
    said = f"What the lab's record says of {papers.label}: calibrations, the factor in force and the verdict"
    own = ProcessingModule(name=module, description=said)
    file.add_processing_module(own)
    for table in papers.tables:
        own.add(_dynamic(table))
    for one in _time_series(file, series) if series is not None else ():
        own.add(one)


def _dynamic(table: Table) -> Any:
    from pynwb.core import DynamicTable, VectorData

    columns = [VectorData(name=one.name, description=one.about, data=_values(one)) for one in table.columns]
    return DynamicTable(name=table.name, description=table.about, columns=columns)


def _values(column: Column) -> Any:
    return np.array(column.values, dtype=float) if column.numeric else list(column.values)


def _time_series(file: Any, series: Series) -> list[Any]:
    """The concentration and its band's two ends, on the clock of the current that they are of."""
    from pynwb import TimeSeries

    current = by_place(file).get(series.of)
    if current is None:
        raise InputError(f"the earlier copy no longer holds '{series.of}', beside which its concentration is to stand")
    times = {"starting_time": current.starting_time, "rate": current.rate}
    if current.timestamps is not None:
        times = {"timestamps": current}  # a link: the file holds its times once
    name = f"concentration_{current.name}"
    parts = (("", series.concentration, "median"), ("_low", series.low, "5 %"), ("_high", series.high, "95 %"))
    return [
        TimeSeries(name=f"{name}{end}", data=data, unit=series.unit, description=f"{what} of {series.about}", **times)
        for end, data, what in parts
    ]
