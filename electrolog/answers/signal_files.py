"""Recordings as they lie in files: CSV, NPY or HDF5, their columns named with their units."""

from __future__ import annotations

import hashlib
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from dataclasses import dataclass
from pathlib import Path
from tokenize import TokenError
from typing import Any

import numpy as np
from numpy.typing import NDArray

from electrolog.errors import ElectrologError, InputError, shortened
from electrolog.measure.scan_sheet import ScanSheet

Array = NDArray[np.float64]

LARGEST_CSV = 4_000_000_000
MOST_SWOLLEN = 200  # times the file's size; real noise packs ten times at best
# What NumPy and HDF5 raise over a file that was cut or overwritten.
BROKEN = (ValueError, EOFError, RuntimeError, MemoryError, SyntaxError, TokenError)
SECONDS = {"time_s": 1.0, "time_ms": 1e-3, "time_min": 60.0}
NANOAMPERES = {"current_na": 1.0, "current_pa": 1e-3, "current_ua": 1e3}
_VOLTS = {"potential_v": 1.0, "potential_mv": 1e-3}


@dataclass(frozen=True)
class ScanFile:
    """A sheet (scans, points) in nA; potentials (points,) and times (scans,) where the file says them."""

    sheet: ScanSheet
    potential_v: Array | None = None
    time_s: Array | None = None


def trace_from(path: Path, rate_hz: float | None = None) -> tuple[Array, Array]:
    """Times in s and currents in nA. `rate_hz`: of a file that holds currents alone."""
    with said_of(path):
        time, current = by_ending(path, {".csv": _csv_trace, ".npy": _npy_trace, ".h5": _hdf_trace})(path, rate_hz)
        return time, current


def scans_from(path: Path) -> ScanFile:
    with said_of(path):
        found: ScanFile = by_ending(path, {".csv": _csv_scans, ".npy": _npy_scans, ".h5": _hdf_scans})(path)
        return found


def injections_from(path: Path) -> list[dict[str, float]]:
    """A table start_s, end_s and, if it is there, concentration_um; a row per injection."""
    with said_of(path):
        table = _table(path)
        missing = [name for name in ("start_s", "end_s") if name not in table]
        if missing:
            raise InputError(
                f"has no column {' or '.join(missing)}; accepted: start_s, end_s and, if wanted, concentration_um"
            )
        names = [name for name in ("start_s", "end_s", "concentration_um") if name in table]
        rows: list[dict[str, float]] = table[names].to_dict("records")
        return rows


def fingerprint(path: Path) -> str:
    """SHA-256: which file it was, wherever it is moved to."""
    with path.open("rb") as file:
        return hashlib.file_digest(file, "sha256").hexdigest()


@contextmanager
def said_of(path: Path) -> Iterator[None]:
    """Every refusal names the file."""
    try:
        yield
    except InputError as error:
        raise InputError(f"{path.name}: {error.message}", error.hint) from None
    except BROKEN as why:
        raise InputError(f"{path.name}: can't be read ({shortened(str(why), 160)})", "is it whole?") from None


def by_ending(path: Path, readers: dict[str, Callable[..., Any]]) -> Callable[..., Any]:
    if not path.is_file():
        raise InputError("there is no such file")
    ending = path.suffix.casefold()
    reader = readers.get(".h5" if ending in (".hdf5", ".hdf") else ending)
    if reader is None:
        raise InputError(f"'{shortened(ending, 20)}' is no kind of recording; accepted: .csv, .npy, .h5, .hdf5")
    return reader


# --- CSV ------------------------------------------------------------------------------------------------------


def _csv_trace(path: Path, _: float | None) -> tuple[Array, Array]:
    table = _table(path)
    return _scaled(table, SECONDS, "time"), _scaled(table, NANOAMPERES, "current")


def _csv_scans(path: Path) -> ScanFile:
    """First row: time_s, then the potentials in V; below it the time of each scan and its currents in nA."""
    header = header_of(path)
    try:
        potential = np.array([float(cell) for cell in header[1:]])
    except ValueError as why:
        raise InputError(
            f"its first row holds something else than potentials ({shortened(str(why))}); accepted: time_s, then the "
            "potential of each point in V"
        ) from None
    factor = SECONDS.get(header[0].casefold())
    if factor is None:
        raise InputError(f"its first column is called '{shortened(header[0])}'; accepted: {', '.join(SECONDS)}")
    cells = _numbers(path, header=None, skiprows=1)
    if cells.shape[1] != len(header):
        raise InputError(f"has {cells.shape[1]} columns below {len(header)} names; each column needs one")
    return ScanFile(cells[:, 1:], potential, cells[:, 0] * factor)


def _table(path: Path) -> Any:
    import pandas as pd

    names = [cell.casefold() for cell in header_of(path)]
    return pd.DataFrame(_numbers(path, header=0), columns=names)


def header_of(path: Path) -> list[str]:
    _refuse_large(path)
    with path.open(encoding="utf-8-sig") as file:
        first = file.readline(1_000_000).strip()
    if not first:
        raise InputError("its first row is empty; accepted: the names of the columns")
    return [cell.strip().strip('"') for cell in first.split(separator_of(first))]


def _numbers(path: Path, header: int | None, skiprows: int = 0) -> Array:
    """(rows, columns); an empty cell is NaN. Raises InputError naming the first cell that is no number."""
    import pandas as pd

    with path.open(encoding="utf-8-sig") as file:
        separator = separator_of(file.readline(1_000_000))
    settings: dict[str, Any] = {"sep": separator, "header": header, "skiprows": skiprows, "encoding": "utf-8-sig"}
    try:
        return np.asarray(pd.read_csv(path, dtype=np.float64, **settings).to_numpy())
    except ValueError as why:
        raise _bad_cell(pd.read_csv(path, dtype=str, **settings), why, 2 if header == 0 else 1 + skiprows) from None


def _bad_cell(cells: Any, why: ValueError, first_line: int) -> ElectrologError:
    import pandas as pd

    for place, name in enumerate(cells.columns):
        column = cells[name]
        bad = np.flatnonzero(pd.to_numeric(column, errors="coerce").isna() & column.notna())
        if bad.size:
            found = shortened(str(column.iloc[bad[0]]))
            return InputError(
                f"line {bad[0] + first_line}, column {place + 1}: '{found}' is not a number; accepted: numbers with . "
                "as their decimal mark"
            )
    return InputError(shortened(str(why), 160))


def separator_of(line: str) -> str:
    return max((",", ";", "\t"), key=line.count)


def _refuse_large(path: Path) -> None:
    size = path.stat().st_size
    if size > LARGEST_CSV:
        raise InputError(
            f"{size / 1e9:.1f} GB of text are too many; accepted: up to {LARGEST_CSV / 1e9:g} GB",
            "save it as NPY or HDF5: a tenth of the size, and read at once",
        )


# --- NPY ------------------------------------------------------------------------------------------------------


def _npy_trace(path: Path, rate_hz: float | None) -> tuple[Array, Array]:
    """Named columns, or two columns of s and nA, or currents alone with the rate they were taken at."""
    found = mapped(path)
    if found.dtype.names:
        table = {name.casefold(): found[name] for name in found.dtype.names}
        return _scaled(table, SECONDS, "time"), _scaled(table, NANOAMPERES, "current")
    if found.ndim == 2 and 2 in found.shape:
        time, current = found.T if found.shape[1] == 2 else found
        return np.asarray(time, dtype=float), np.asarray(current, dtype=float)
    if found.ndim == 1:
        return _even_times(len(found), rate_hz), np.asarray(found, dtype=float)
    raise InputError(
        f"holds an array of shape {found.shape}; accepted: two columns of seconds and nA, or currents alone with --rate"
    )


def _even_times(samples: int, rate_hz: float | None) -> Array:
    if rate_hz is None:
        raise InputError("holds currents without times; accepted: the samples per second too, as in --rate 10")
    if not rate_hz > 0:
        raise InputError(f"rate: {rate_hz:g} per second is no rate; accepted: above zero")
    return np.arange(samples) / rate_hz


def _npy_scans(path: Path) -> ScanFile:
    found = mapped(path)
    if found.ndim != 2 or found.dtype.names:
        raise InputError(f"holds an array of shape {found.shape}; accepted: a row per scan, a column per potential")
    return ScanFile(found)


def mapped(path: Path) -> Any:
    """Mapped, not read: a sheet may be larger than the memory there is. Pickled objects are refused."""
    found = np.load(path, mmap_mode="r", allow_pickle=False)
    kinds = [found.dtype[name].kind for name in found.dtype.names] if found.dtype.names else [found.dtype.kind]
    if not set(kinds) <= set("fiu"):
        raise InputError(f"holds {found.dtype}, which are no numbers; accepted: floating-point or whole numbers")
    return found


# --- HDF5 -----------------------------------------------------------------------------------------------------


def _hdf_trace(path: Path, rate_hz: float | None) -> tuple[Array, Array]:
    table = _loaded(path)
    current = _scaled(table, NANOAMPERES, "current")
    if current.ndim != 1:
        raise InputError(f"its currents have the shape {current.shape}; a trace has one row of them")
    timed = any(name in table for name in SECONDS)
    return _scaled(table, SECONDS, "time") if timed else _even_times(len(current), rate_hz), current


def _hdf_scans(path: Path) -> ScanFile:
    """A dataset current_na (scans, points); potential_v (points,) and time_s (scans,) where they are there."""
    table = _loaded(path)
    sheet = next((table[name] * factor for name, factor in NANOAMPERES.items() if name in table and factor != 1), None)
    sheet = sheet if sheet is not None else _one_of(table, NANOAMPERES, "current")[0]
    if sheet.ndim != 2:
        raise InputError(f"its currents have the shape {sheet.shape}; accepted: a row per scan, a column per potential")
    potential = _scaled(table, _VOLTS, "potential") if any(name in table for name in _VOLTS) else None
    time = _scaled(table, SECONDS, "time") if any(name in table for name in SECONDS) else None
    if potential is not None and sheet.shape[0] == potential.size != sheet.shape[1]:
        sheet = sheet.T
    return ScanFile(sheet, potential, time)


@contextmanager
def datasets(path: Path) -> Iterator[dict[str, Any]]:
    """Those of a known name, by the last part of it, while the file is open.

    Raises InputError where h5py isn't installed, the file can't be read, or a name stands there twice.
    """
    try:
        import h5py
    except ModuleNotFoundError:
        raise InputError(
            "reading HDF5 needs h5py, which isn't installed",
            "install it with: python -m pip install h5py; or save the recording as NPY or CSV",
        ) from None
    found: dict[str, Any] = {}

    def keep(name: str, item: Any) -> None:
        short = name.rpartition("/")[2].casefold()
        if isinstance(item, h5py.Dataset) and short in {**SECONDS, **NANOAMPERES, **_VOLTS}:
            if short in found:
                raise InputError(f"holds several datasets called {short}; accepted: one")
            if item.nbytes > max(2**26, MOST_SWOLLEN * path.stat().st_size):
                raise InputError(f"its {short} would unpack to {item.nbytes / 1e9:.3g} GB, more than such a file holds")
            found[short] = item

    try:
        with h5py.File(path, "r") as file:
            file.visititems(keep)
            yield found
    except (OSError, RuntimeError) as why:
        raise InputError(f"is no HDF5 file that can be read ({shortened(str(why), 120)})") from None


def _loaded(path: Path) -> dict[str, Any]:
    with datasets(path) as found:
        return {name: item[()] for name, item in found.items()}


# --- columns --------------------------------------------------------------------------------------------------


def _scaled(table: Any, factors: dict[str, float], what: str) -> Array:
    values, factor = _one_of(table, factors, what)
    return np.asarray(values, dtype=float) * factor


def _one_of(table: Any, factors: dict[str, float], what: str) -> tuple[Any, float]:
    found = [name for name in factors if name in table]
    if len(found) != 1:
        said = f"has {' and '.join(found)}" if found else f"has no {what}"
        raise InputError(f"{said}; accepted: one of {', '.join(factors)}")
    return table[found[0]], factors[found[0]]
