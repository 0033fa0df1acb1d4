"""A probe's life read as a story: what was done, how long it was exposed, in what state it is now."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Sequence
from dataclasses import dataclass
from datetime import datetime, timedelta

from electrolog.clock import shown_moment
from electrolog.record import sheets
from electrolog.record.queries import Event

RENEWING = (sheets.CLEANINGS, sheets.COATINGS, sheets.RECUTS)


@dataclass(frozen=True)
class State:
    """What may be said of a probe at a moment, from its events alone.

    `name` is one of: untested (never calibrated), calibrated (nothing done to it since its last calibration), used
    or renewed (cleaned, coated, re-cut) since its last calibration, retired (with `reason`).
    """

    name: str
    reason: str | None
    exposure_h: dict[str, float]
    uses: int
    last_calibration: datetime | None
    retired_at: datetime | None


def until(life: Sequence[Event], moment: datetime) -> list[Event]:
    return [event for event in life if event.at <= moment]


def of(life: Sequence[Event], sheet: sheets.Sheet) -> list[Event]:
    return [event for event in life if event.sheet is sheet]


def end_of(exposure: Event) -> datetime:
    return exposure.at + timedelta(minutes=exposure.row["duration_min"])


def exposure_h(life: Sequence[Event], moment: datetime | None = None) -> dict[str, float]:
    """Hours in each setting up to a moment; of an exposure under way, its part until then."""
    hours: dict[str, float] = defaultdict(float)
    for exposure in of(life, sheets.EXPOSURES):
        end = end_of(exposure) if moment is None else min(end_of(exposure), moment)
        if end > exposure.at:
            hours[exposure.row["setting"]] += (end - exposure.at) / timedelta(hours=1)
    return dict(hours)


def state(life: Sequence[Event], moment: datetime) -> State:
    past = until(life, moment)
    calibrations = of(past, sheets.CALIBRATIONS)
    exposures = of(past, sheets.EXPOSURES)
    retirement = next(iter(of(past, sheets.RETIREMENTS)), None)
    last = calibrations[-1].at if calibrations else None
    if retirement:
        name = "retired"
    elif last is None:
        name = "untested"
    else:
        name = _since(past, last)
    return State(
        name,
        retirement.row["reason"] if retirement else None,
        exposure_h(past, moment),
        len(exposures),
        last,
        retirement.at if retirement else None,
    )


def _since(past: Sequence[Event], calibrated: datetime) -> str:
    if any(end_of(exposure) > calibrated for exposure in of(past, sheets.EXPOSURES)):
        return "used"
    renewed = any(event.sheet in RENEWING and event.at > calibrated for event in past)
    return "renewed" if renewed else "calibrated"


def reference(life: Sequence[Event], analyte: str, waveform: str, moment: datetime | None = None) -> Event | None:
    """The calibration that the share left is a share of: the first comparable one since the carbon was last made new.

    A re-cut or a new film makes another surface, so what came before is no reference for what comes after.
    """
    past = life if moment is None else until(life, moment)
    made_new = [event.at for event in past if event.sheet in (sheets.RECUTS, sheets.COATINGS)]
    comparable = comparable_calibrations(past, analyte, waveform)
    since = [event for event in comparable if not made_new or event.at >= max(made_new)]
    return next(iter(since), None)


def comparable_calibrations(life: Sequence[Event], analyte: str, waveform: str) -> list[Event]:
    return [
        event
        for event in of(life, sheets.CALIBRATIONS)
        if event.row["analyte"] == analyte and event.row["waveform"] == waveform
    ]


def voided_by(life: Sequence[Event], calibration: Event, moment: datetime) -> list[str]:
    """What has happened since a calibration that its factor can't know of, in words."""
    said = []
    for event in until(life, moment):
        if event.sheet is sheets.EXPOSURES and end_of(event) > calibration.at:
            said.append(_run(event, moment))
        elif event.sheet in RENEWING and event.at > calibration.at:
            what = event.row.get("method") if event.sheet is sheets.CLEANINGS else event.row.get("material")
            said.append(f"{event.sheet.one}{f' with {what}' if what else ''}")
    return said


def _run(exposure: Event, moment: datetime) -> str:
    where, number = exposure.row["setting"], exposure.row["id"]
    if end_of(exposure) > moment:
        return f"in use right now, in {where} until {shown_moment(end_of(exposure))} (exposure {number})"
    return f"{exposure.row['duration_min'] / 60:.3g} h in {where} (exposure {number})"


def in_use_until(life: Sequence[Event], moment: datetime) -> datetime | None:
    """The end of an exposure that is under way; None when there is none."""
    under_way = [end_of(event) for event in of(until(life, moment), sheets.EXPOSURES) if end_of(event) > moment]
    return max(under_way, default=None)
