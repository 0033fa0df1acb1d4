"""What a lab's probes have taught the fit of their cohort, in the terms of the bench."""

from __future__ import annotations

from collections import Counter
from collections.abc import Sequence
from dataclasses import dataclass
from datetime import datetime

import numpy as np
from numpy.typing import NDArray

from electrolog.answers import fits
from electrolog.answers.cohorts import Cohort
from electrolog.answers.fits import Assay
from electrolog.answers.untold import untold
from electrolog.errors import DataError
from electrolog.fouling.events import EXPOSURE, READING, RENEWAL
from electrolog.fouling.fit import CohortFit, Component
from electrolog.fouling.forecast import posterior
from electrolog.fouling.parameters import Scales, read_scales
from electrolog.fouling.points import normal_points
from electrolog.record import queries
from electrolog.record.names import Names
from electrolog.record.readable import row_by_id
from electrolog.record.sheets import ANALYTES
from electrolog.record.store import Connection, Record

Floats = NDArray[np.float64]
PER_DRAW = 16  # draws of the shared effects under each draw of the hyper-parameters
ORDINARY_SDS = 3.0  # a day this far out is no ordinary one, if its own interval excludes zero too
LIKELY = 0.5  # odds from which a slip or a damage is named


@dataclass(frozen=True)
class Estimate:
    """Median and central 90 % interval; inf is a half-life that is never reached."""

    median: float
    low: float
    high: float


@dataclass(frozen=True)
class HalfLife:
    """Hours in vivo until a typical probe of this kind has lost half of its sensitivity."""

    coating: str
    waveform: str
    hours: Estimate
    probes: int
    calibrations: int


@dataclass(frozen=True)
class Setting:
    """How fast a setting fouls, in vivo being one; `exposure_h` over all probes."""

    setting: str
    weight: Estimate
    exposure_h: float
    probes: int


@dataclass(frozen=True)
class Recovery:
    """The share of the fouling that a renewal undoes."""

    method: str
    share: Estimate
    times: int
    probes: int


@dataclass(frozen=True)
class Day:
    """By how much all readings of a standard, a rig and a date stood too high (+) or too low, as a share."""

    standard: str
    rig: str
    date: str
    effect: Estimate
    probes: int
    suspicious: bool


@dataclass(frozen=True)
class Spreads:
    """Relative standard deviations, in log units: between probes' levels and rates, of days, of one reading."""

    level: Estimate
    rate: Estimate | None
    day: Estimate
    residual: Estimate


@dataclass(frozen=True)
class FittedCohort:
    """`flags` name the calibrations that look like a slip and the probes that look suddenly damaged."""

    analyte: str
    method: str
    made_at: datetime | None
    converged: bool
    probes: int
    calibrations: int
    shapes: dict[str, float]
    half_lives: tuple[HalfLife, ...]
    settings: tuple[Setting, ...]
    recoveries: tuple[Recovery, ...]
    days: tuple[Day, ...]
    spreads: Spreads
    flags: tuple[str, ...]
    notes: tuple[str, ...]

    @property
    def suspicious_days(self) -> tuple[Day, ...]:
        return tuple(day for day in self.days if day.suspicious)


def whole_cohort(connection: Connection, analyte: str) -> Assay:
    """The analyte with every waveform. Raises UnknownName."""
    analyte_id = Names(connection).row_id("analytes", analyte)
    return Assay(row_by_id(connection, ANALYTES, analyte_id)["analyte"], "", analyte_id)


def fitted_cohort(record: Record, analyte: str, fresh: bool = False) -> FittedCohort:
    """The kept fit, made if there is none or if the record has changed enough, read with the cohort that is there now.

    Raises UnknownName, and DataError where nothing was calibrated with the analyte.
    """
    with record.reading() as connection:
        asked = whole_cohort(connection, analyte)
    cohort = fits.gathered(record, asked)
    if not np.any(cohort.events.kind == READING):
        raise DataError(
            f"no calibration with {asked.analyte} gives a sensitivity: there is nothing to fit",
            "log calibrations with `electrolog calibrate`, or `electrolog import` a folder",
        )
    fit = fits.fit_for(record, asked, fresh)
    with record.reading() as connection:
        kept = queries.kept_fit(connection, asked.analyte_id)
    return _told(asked.analyte, fit, cohort, None if kept is None else kept.made_at)


def _told(analyte: str, fit: CohortFit, cohort: Cohort, made_at: datetime | None) -> FittedCohort:
    settings, recoveries, days = _settings(fit, cohort), _recoveries(fit, cohort), _days(fit, cohort)
    return FittedCohort(
        analyte=analyte,
        method=fit.method,
        made_at=made_at,
        converged=fit.converged,
        probes=len({electrode for electrode, _ in cohort.units}),
        calibrations=fit.n_readings,
        shapes=dict(sorted(fit.shape_weights.items(), key=lambda item: -item[1])),
        half_lives=_half_lives(fit, cohort),
        settings=settings,
        recoveries=recoveries,
        days=days,
        spreads=_spreads(fit),
        flags=_flags(fit, cohort),
        notes=tuple(dict.fromkeys((*fit.notes, *untold(fit, cohort), *_left_out(cohort)))),
    )


# --- from the draws ---------------------------------------------------------------------------------------


def _estimate(draws: Floats) -> Estimate:
    # Quantiles that are draws themselves: between a number and infinity there is no middle.
    low, median, high = np.quantile(draws, (0.05, 0.5, 0.95), method="inverted_cdf").tolist()
    return Estimate(median, low, high)


def _scales(fit: CohortFit) -> list[Scales]:
    return [read_scales(part.layout, part.theta_draws) for part in fit.components]


def _spreads(fit: CohortFit) -> Spreads:
    scales = _scales(fit)
    rates = [one.latent_sds[:, 0] for one in scales if one.latent_sds.shape[1]]
    return Spreads(
        level=_estimate(np.concatenate([one.level_sd for one in scales])),
        rate=_estimate(np.concatenate(rates)) if rates else None,
        day=_estimate(np.concatenate([one.day_sd for one in scales])),
        residual=_estimate(np.concatenate([one.residual_sd for one in scales])),
    )


def _half_lives(fit: CohortFit, cohort: Cohort) -> tuple[HalfLife, ...]:
    kinds = list(zip(cohort.events.groups["coating"], cohort.events.groups["waveform"], strict=True))
    readings = Counter(kinds[unit] for unit in cohort.events.unit[cohort.events.kind == READING])
    return tuple(
        HalfLife(
            coating,
            waveform,
            _estimate(np.concatenate([_half_life_h(part, coating, waveform) for part in fit.components])),
            probes=kinds.count((coating, waveform)),
            calibrations=readings[coating, waveform],
        )
        for coating, waveform in sorted(set(kinds))
    )


def _half_life_h(part: Component, coating: str, waveform: str) -> Floats:
    """(K PER_DRAW,) of a probe at the cohort's centre but for its coating and waveform."""
    count = len(part.theta_draws) * PER_DRAW
    parameters = np.repeat(read_scales(part.layout, part.theta_draws).shape, PER_DRAW, axis=0)
    found = part.layout.shape.half_life_hours(_latents(part, coating, waveform), parameters)
    return np.broadcast_to(found, (count,))


def _latents(part: Component, coating: str, waveform: str) -> Floats:
    """(K PER_DRAW, q) draws of the mean latents: shared effects drawn given each draw of the hyper-parameters."""
    names = part.effects.names
    own = {("rate", "coating", coating), ("rate", "waveform", waveform)}
    sums = np.zeros((len(part.layout.shape.latents), len(names)))
    for k in range(len(sums)):
        sums[k] = [name == ("latent", str(k)) or (k == 0 and name in own) for name in names]
    covariance = sums @ part.covariance[: len(names), : len(names)] @ sums.T
    means = part.mean_draws[:, : len(names)] @ sums.T
    around = normal_points(PER_DRAW, len(sums)) @ np.linalg.cholesky(covariance).T if len(sums) else 0.0
    return np.asarray(means[:, None, :] + around).reshape(-1, len(sums))


def _settings(fit: CohortFit, cohort: Cohort) -> tuple[Setting, ...]:
    exposed = cohort.events.kind == EXPOSURE
    found = []
    for name in fit.components[0].layout.settings:
        rows = exposed & (cohort.events.which == _place(cohort.events.settings, name))
        place = fit.components[0].layout.settings.index(name)
        weight = np.concatenate([scales.weight[:, place] for scales in _scales(fit)])
        found.append(Setting(name, _estimate(weight), float(cohort.events.amount[rows].sum()), _probes(cohort, rows)))
    return tuple(found)


def _recoveries(fit: CohortFit, cohort: Cohort) -> tuple[Recovery, ...]:
    renewed = cohort.events.kind == RENEWAL
    found = []
    for place, name in enumerate(fit.components[0].layout.renewals):
        rows = renewed & (cohort.events.which == _place(cohort.events.renewals, name))
        share = np.concatenate([scales.recovery[:, place] for scales in _scales(fit)])
        found.append(Recovery(name.removeprefix("clean:"), _estimate(share), int(rows.sum()), _probes(cohort, rows)))
    return tuple(found)


def _place(names: Sequence[str], name: str) -> int:
    """A name that the record has lost since the fit was made stands nowhere."""
    return names.index(name) if name in names else -1


def _probes(cohort: Cohort, rows: NDArray[np.bool_]) -> int:
    return len({cohort.units[unit][0] for unit in cohort.events.unit[rows]})


def _days(fit: CohortFit, cohort: Cohort) -> tuple[Day, ...]:
    """Every calibration day, the earliest first."""
    day_sd = float(np.mean(np.concatenate([scales.day_sd for scales in _scales(fit)])))
    weight = np.array([part.weight for part in fit.components])
    found = []
    for place, name in enumerate(cohort.events.days):
        seen = [_effect(part, ("day", name)) for part in fit.components]
        if None in seen:  # measured since the fit was made
            continue
        means, variances = np.array(seen, dtype=float).T
        mean = float(weight @ means)
        sd = float(np.sqrt(weight @ (variances + (means - mean) ** 2)))
        low, median, high = np.expm1(mean + sd * np.array([-1.645, 0.0, 1.645])).tolist()
        rows = (cohort.events.kind == READING) & (cohort.events.which == place)
        odd = abs(mean) > ORDINARY_SDS * day_sd and abs(mean) > 1.96 * sd
        standard, rig, date = name.split("\n")
        found.append(Day(standard, rig, date, Estimate(median, low, high), _probes(cohort, rows), odd))
    return tuple(sorted(found, key=lambda day: (day.date, day.standard, day.rig)))


def _effect(part: Component, name: tuple[str, ...]) -> tuple[float, float] | None:
    """Mean and variance of one shared effect; None: this fit has never heard of it."""
    if name not in part.effects.names:
        return None
    k = part.effects.names.index(name)
    return float(part.mean[k]), float(part.covariance[k, k])


def _flags(fit: CohortFit, cohort: Cohort) -> tuple[str, ...]:
    seen = posterior(fit, cohort.events)
    calibrations = [event.row["calibration"] for unit in cohort.units for event in cohort.readings[unit]]
    slips = [calibrations[place] for place in np.flatnonzero(seen.slipped > LIKELY)]
    broken = dict.fromkeys(cohort.units[place][0] for place in np.flatnonzero(seen.damaged > LIKELY))
    said = [f"{name} looks like a slip of a unit or a decimal" for name in slips]
    return (*said, *[f"{name} looks suddenly damaged" for name in broken])


def _left_out(cohort: Cohort) -> list[str]:
    return [f"{name} is left out: {why}" for name, why in cohort.left_out.items()]
