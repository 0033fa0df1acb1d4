"""What is to go with which recording, and what did."""

from __future__ import annotations

from dataclasses import dataclass
from datetime import datetime
from pathlib import Path

from electrolog.answers.answer import Answer
from electrolog.answers.recordings.candidates import ENCLOSED
from electrolog.answers.recordings.factor import Factor
from electrolog.judge.verdict import Verdict

UNITS = {"uM": ("micromolar", "um", 1.0), "nM": ("nanomolar", "nm", 1000.0)}  # NWB's word, ours, of one µM


@dataclass(frozen=True)
class Wanted:
    """What goes with which recording.

    `probe`: None where the recording tells it. `exposure`, `start`: which run it was, where the record can't tell by
    the file. `unit`: uM or nM. `series`: of an NWB file with several currents. `again` replaces our own earlier part.
    """

    file: Path
    analyte: str
    probe: str | None = None
    waveform: str | None = None
    setting: str | None = None
    exposure: int | None = None
    start: datetime | None = None
    rate_hz: float | None = None
    needs_um: float | None = None
    convert: bool = False
    series: str | None = None
    unit: str = "uM"
    out: Path | None = None
    in_place: bool = False
    again: bool = False

    @property
    def stem(self) -> str:
        """The recording's name; a copy with papers in it has the same."""
        return self.file.stem.removesuffix(ENCLOSED)


@dataclass(frozen=True)
class Enclosed(Answer):
    """`tables`: rows by name. `series`: names of what was converted. `exposure`: the run, where it is on record."""

    electrode: str
    target: str
    tables: dict[str, int]
    series: tuple[str, ...]
    factor: Factor | None
    verdict: Verdict | None
    exposure: int | None
    warnings: tuple[str, ...]
