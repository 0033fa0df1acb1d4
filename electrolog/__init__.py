"""The life of every carbon-fibre microelectrode: its record, a forecast of its fouling, a verdict before a run.

    import electrolog

    lab = electrolog.open_lab("lab.db")  # to be read only
    electrolog.frame(lab.readings(["B1-01"]))
    electrolog.draw.history(lab.courses(["B1-01"])[0])
    lab.check(["B1-01"], electrolog.Run("dopamine", "triangle", "in-vivo", run_min=120))

    lab = electrolog.open_lab("lab.db", write=True)  # every entry is journalled, as those of the terminal are
    lab.log("cleanings", ["B1-01"], {"at": "now", "method": "isopropanol"})

The names in __all__ are what other programs may rely on.
"""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from datetime import tzinfo

    from electrolog.answers.asked import Run
    from electrolog.answers.calibrating import NewCalibration
    from electrolog.answers.frames import frame
    from electrolog.errors import DoubtfulEntry, ElectrologError, InputError
    from electrolog.lab import Lab
    from electrolog.show import draw

__all__ = [
    "DoubtfulEntry",
    "ElectrologError",
    "InputError",
    "Lab",
    "NewCalibration",
    "Run",
    "draw",
    "frame",
    "open_lab",
]

_HOMES = {
    "DoubtfulEntry": "errors",
    "ElectrologError": "errors",
    "InputError": "errors",
    "Lab": "lab",
    "NewCalibration": "answers.calibrating",
    "Run": "answers.asked",
    "frame": "answers.frames",
}


def open_lab(
    where: str | None = None, *, zone: tzinfo | None = None, who: str | None = None, write: bool = False
) -> Lab:
    """The lab whose record is at `where`: a file, or an SQLAlchemy URL; None: ELECTROLOG_DB or the platform's place.

    It is only read unless `write`, which also makes a record where there is none. `zone` is that of times without
    an offset (None: the machine's), `who` the name in the journal (None: the machine's or the database's user).
    Several processes may have it open. Raises RecordError for a database that can't be used, InputError for a URL.
    """
    from electrolog import lab

    opened = lab.open_lab(where, zone=zone, who=who, create=write)
    opened.record.read_only = not write
    return opened


def __getattr__(name: str) -> Any:
    # The terminal asks for help far more often than for the database, which takes most of the time to load.
    from importlib import import_module

    if name == "draw":
        return import_module("electrolog.show.draw")
    if name in _HOMES:
        return getattr(import_module(f"electrolog.{_HOMES[name]}"), name)
    raise AttributeError(f"module 'electrolog' has no attribute {name!r}")
