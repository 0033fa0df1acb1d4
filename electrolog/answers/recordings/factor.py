"""The factor in force at a moment: of which calibration, how sure, how long it may be used, and what speaks against."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from datetime import datetime, timedelta

from electrolog.answers import life as lives
from electrolog.judge.limits import Limits
from electrolog.measure.calibrate import CalibrationFigures
from electrolog.record.queries import Event

AGE_RULE = "oldest-calibration"


@dataclass(frozen=True)
class Factor:
    """Of the probe's newest comparable calibration by then; low to high: its 95 % interval, None where unknown.

    `oldest_allowed_h`: the lab's own limit; None: it has set none. `void_because`: what has happened since that the
    factor can't know of. `in_force`: None where no limit says how old it may be and nothing else speaks against it.
    """

    calibration: str
    at: datetime
    analyte: str
    waveform: str
    sensitivity_na_um: float | None
    sensitivity_se_na_um: float | None
    low_na_um: float | None
    high_na_um: float | None
    age_h: float
    oldest_allowed_h: float | None
    void_because: tuple[str, ...]

    @property
    def valid_until(self) -> datetime | None:
        if self.oldest_allowed_h is None or self.void_because:
            return None
        return self.at + timedelta(hours=self.oldest_allowed_h)

    @property
    def in_force(self) -> bool | None:
        if self.sensitivity_na_um is None or self.void_because:
            return False
        return None if self.oldest_allowed_h is None else self.age_h <= self.oldest_allowed_h


def factor_at(
    moment: datetime,
    life: Sequence[Event],
    figures: dict[int, CalibrationFigures],
    assay: tuple[str, str],
    limits: Limits,
) -> Factor | None:
    """None where the probe had no comparable calibration by then. assay: analyte, waveform."""
    comparable = lives.comparable_calibrations(lives.until(life, moment), *assay)
    if not comparable:
        return None
    last = comparable[-1]
    own = figures[last.row["id"]]
    return Factor(
        calibration=last.row["calibration"],
        at=last.at,
        analyte=assay[0],
        waveform=assay[1],
        sensitivity_na_um=own.sensitivity_na_um,
        sensitivity_se_na_um=own.sensitivity_se_na_um,
        low_na_um=own.sensitivity_low_na_um,
        high_na_um=own.sensitivity_high_na_um,
        age_h=(moment - last.at) / timedelta(hours=1),
        oldest_allowed_h=limits.value(AGE_RULE),
        void_because=tuple(lives.voided_by(life, last, moment)),
    )
