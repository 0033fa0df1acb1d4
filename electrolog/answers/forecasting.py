"""What probes will still see after a run: quantiles of the TRUE sensitivity, not of a next calibration's reading."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from datetime import datetime

import numpy as np

from electrolog.answers import life as lives
from electrolog.answers.answer import Answer
from electrolog.answers.asked import Asked, Floats, Run, ask
from electrolog.errors import InputError
from electrolog.record.store import Record

Quantiles = dict[float, float]


@dataclass(frozen=True)
class NowAndEnd:
    """By probability; None where there is nothing to compare with."""

    now: Quantiles | None
    end: Quantiles | None


@dataclass(frozen=True)
class Basis:
    """What a forecast rests on: the cohort's probes and calibrations, this probe's own, and what can't be told."""

    probes: int
    calibrations: int
    own_calibrations: int
    shapes: dict[str, float]
    converged: bool
    notes: tuple[str, ...]


@dataclass(frozen=True)
class Forecast(Answer):
    electrode: str
    analyte: str
    waveform: str
    setting: str
    run_min: float
    exposure_h: float
    sensitivity_na_um: NowAndEnd
    fraction_left: NowAndEnd
    basis: Basis


def forecasts(
    record: Record, labels: Sequence[str], run: Run, quantiles: Sequence[float], moment: datetime | None = None
) -> list[Forecast]:
    """One forecast per probe, in the order of labels. Raises InputError for a quantile outside 0 to 1."""
    for q in quantiles:
        if not 0 < q < 1:
            raise InputError(f"quantiles: {q:g} is out of range; accepted: between 0 and 1, such as 0.05,0.5,0.95")
    asked = ask(record, labels, run, moment)
    now, end = (np.exp(asked.posterior.log_sensitivity(asked.extra_hours(m))) for m in (0.0, run.run_min))
    return [
        _forecast(asked, run, place, label, now[place], end[place], quantiles)
        for place, label in enumerate(asked.labels)
    ]


def _forecast(
    asked: Asked, run: Run, place: int, label: str, now: Floats, end: Floats, quantiles: Sequence[float]
) -> Forecast:
    reference = asked.reference_draws(place)
    life = asked.life[label]
    return Forecast(
        electrode=label,
        analyte=asked.assay.analyte,
        waveform=asked.assay.waveform,
        setting=asked.setting,
        run_min=run.run_min,
        exposure_h=sum(lives.exposure_h(life, asked.moment).values()),
        sensitivity_na_um=NowAndEnd(_at(now, quantiles), _at(end, quantiles)),
        fraction_left=NowAndEnd(
            None if reference is None else _at(now / reference, quantiles),
            None if reference is None else _at(end / reference, quantiles),
        ),
        basis=Basis(
            probes=asked.fit.n_units,
            calibrations=asked.fit.n_readings,
            own_calibrations=len(asked.cohort.readings[label, asked.assay.waveform]),
            shapes=dict(asked.fit.shape_weights),
            converged=asked.fit.converged,
            notes=(*asked.fit.notes, *asked.said_of(label)),
        ),
    )


def _at(draws: Floats, quantiles: Sequence[float]) -> Quantiles:
    return dict(zip(quantiles, np.quantile(draws, quantiles).tolist(), strict=True))
