"""A recording is never worked on: what is added goes into a copy, which takes its place in one step or not at all."""

from __future__ import annotations

import os
import shutil
import stat
import tempfile
import time
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path

from electrolog.errors import ElectrologError, InputError

PART = ".part"
LEFT_BEHIND_S = 86_400.0
SPARE_BYTES = 20_000_000  # beside the copy, for tables and what the format says of itself


@contextmanager
def working_copy(source: Path, target: Path, replace: bool, more_bytes: int = 0) -> Iterator[Path]:
    """Yields a copy of `source` beside `target`; on leaving without an error it becomes `target`.

    `more_bytes`: what large things are to be added.

    Raises InputError where `target` is there and isn't to be replaced, or `source` has changed meanwhile, and
    ElectrologError where the disk is too full. Whatever happens, `source` and `target` are whole.
    """
    _sweep(target)
    before = _stamp(source)
    _refuse_full_disk(source.stat().st_size + more_bytes + SPARE_BYTES, target.parent)
    handle, name = tempfile.mkstemp(prefix=_prefix(target), suffix=PART, dir=target.parent)
    os.close(handle)
    copy = Path(name)
    try:
        shutil.copyfile(source, copy)
        shutil.copymode(source, copy)
        yield copy
        if _stamp(source) != before:
            raise InputError(
                f"{source.name}: was changed by another program meanwhile; nothing was put in", "ask again"
            )
        _to_disk(copy)
        _publish(copy, target, replace)
    finally:
        copy.unlink(missing_ok=True)


def _prefix(target: Path) -> str:
    return f".{target.stem[:40]}-"


def _sweep(target: Path) -> None:
    """Copies of this file that a killed process has left; younger ones may be another's under way."""
    for path in target.parent.glob(f".*{PART}"):
        if path.name.startswith(_prefix(target)) and time.time() - path.stat().st_mtime > LEFT_BEHIND_S:
            path.unlink(missing_ok=True)


def refuse_read_only(path: Path) -> None:
    """A file that somebody has protected isn't replaced by one that isn't."""
    if not (os.access(path, os.W_OK) and path.stat().st_mode & stat.S_IWUSR):
        raise InputError(f"{path.name}: is write-protected; accepted: a copy, without --in-place")


def _stamp(path: Path) -> tuple[int, int]:
    found = path.stat()
    return found.st_size, found.st_mtime_ns


def _refuse_full_disk(needed: int, folder: Path) -> None:
    free = shutil.disk_usage(folder).free
    if free < needed:
        raise ElectrologError(
            f"{folder}: {free / 1e9:.3g} GB are free; the copy needs {needed / 1e9:.3g} GB",
            "make room, or name another place with --out",
        )


def _to_disk(path: Path) -> None:
    with path.open("rb+") as file:
        os.fsync(file.fileno())


def _publish(copy: Path, target: Path, replace: bool) -> None:
    if replace:
        copy.replace(target)
        return
    try:
        os.link(copy, target)  # unlike a rename it never goes over what another program has put there meanwhile
    except FileExistsError:
        raise InputError(f"{target.name} is there already, and nothing is overwritten") from None
    except OSError:  # a disk without hard links
        copy.rename(target)
