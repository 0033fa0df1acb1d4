"""The cohort's losses side by side: every probe's readings aligned at its reference, and the typical probe's loss."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass

import numpy as np

from electrolog.answers import fits, history
from electrolog.answers.answer import Answer
from electrolog.answers.fitting import whole_cohort
from electrolog.answers.history import Reading
from electrolog.fouling.fit import CohortFit
from electrolog.fouling.typical import TypicalLoss, typical_loss
from electrolog.record import queries, sheets
from electrolog.record.store import Record

LEAST_HOURS, MOST_HOURS = 8.0, 96.0
_STEPS = 48


@dataclass(frozen=True)
class Trail:
    """One probe with one waveform: hours since its reference, worth as hours in vivo, and the share left by then.

    A probe that was made new (coated, re-cut) begins a new trail.
    """

    electrode: str
    waveform: str
    coating: str
    hours: tuple[float, ...]
    share: tuple[float, ...]


@dataclass(frozen=True)
class Fan(Answer):
    analyte: str
    trails: tuple[Trail, ...]
    typical: tuple[TypicalLoss, ...]


def fan(record: Record, analyte: str) -> Fan:
    """Raises UnknownName."""
    with record.reading() as connection:
        asked = whole_cohort(connection, analyte)
        labels = [probe["electrode"] for probe in queries.probes(connection)]
        films = {
            label: events[-1].row["material"]
            for label, events in queries.events(connection, None, (sheets.COATINGS,)).items()
        }
    fit = fits.fit_for(record, asked, units=())
    weights = {row["setting"]: row["median"] for row in fit.summary["settings"]}
    trails = _trails(history.readings(record, labels, asked.analyte), weights, films)
    longest = max((hours for trail in trails for hours in trail.hours), default=0.0)
    return Fan(asked.analyte, tuple(trails), tuple(_typical(fit, max(longest, LEAST_HOURS))))


def typical_losses(record: Record, analyte: str) -> list[TypicalLoss]:
    with record.reading() as connection:
        asked = whole_cohort(connection, analyte)
    return _typical(fits.fit_for(record, asked, units=()))


def _typical(fit: CohortFit, longest_h: float | None = None) -> list[TypicalLoss]:
    """As far as the record has seen: beyond, a curve would look like knowledge."""
    rows = fit.summary["half_lives"]
    until = longest_h or fit.summary["longest_hours"]
    hours = np.linspace(0.0, min(max(until, LEAST_HOURS), MOST_HOURS), _STEPS + 1)
    return [typical_loss(fit, row["coating"], row["waveform"], hours) for row in rows]


def _trails(found: Sequence[Reading], weights: Mapping[str, float], films: Mapping[str, str]) -> list[Trail]:
    begun: list[list[Reading]] = []
    newest: dict[tuple[str, str], list[Reading]] = {}
    for reading in found:
        key = (reading.electrode, reading.waveform)
        if reading.is_reference:
            newest[key] = [reading]
            begun.append(newest[key])
        elif reading.share_left is not None and key in newest:
            newest[key].append(reading)
    return [_trail(readings, weights, films) for readings in begun]


def _trail(readings: Sequence[Reading], weights: Mapping[str, float], films: Mapping[str, str]) -> Trail:
    first = readings[0]
    hours = [sum(h * weights.get(setting, 1.0) for setting, h in one.exposure_h.items()) for one in readings]
    return Trail(
        first.electrode,
        first.waveform,
        films.get(first.electrode, "none"),
        tuple(at - hours[0] for at in hours),
        tuple(1.0 if one.is_reference else one.share_left or 0.0 for one in readings),
    )
