"""What a recording's file says of the run in which it was made."""

from __future__ import annotations

from dataclasses import dataclass
from datetime import datetime


@dataclass(frozen=True)
class Told:
    """None or empty: it doesn't say. `devices` may hold a label, `probes` are labels for certain.

    `first_s`: the first sample's time on the file's own clock.
    `sha256`: of the file before anything of ours was put in, where we have put something in.
    `zone_assumed`: the start has no offset, and was read in the lab's zone. `said`: what else was assumed.
    """

    start: datetime | None = None
    duration_s: float | None = None
    first_s: float = 0.0
    subject: str | None = None
    probes: tuple[str, ...] = ()
    devices: tuple[str, ...] = ()
    zone_assumed: bool = False
    sha256: str | None = None
    said: tuple[str, ...] = ()
