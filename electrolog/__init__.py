"""The life of every carbon-fibre microelectrode: its record, a forecast of its fouling, a verdict before a run."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from electrolog.lab import Lab, open_lab

__all__ = ["Lab", "open_lab"]


def __getattr__(name: str) -> Any:
    # The terminal asks for help far more often than for the database, which takes most of the time to load.
    if name in __all__:
        from electrolog import lab

        return getattr(lab, name)
    raise AttributeError(f"module 'electrolog' has no attribute {name!r}")
