"""Would the forecasts have been right? Every later calibration of the lab's, forecast from what was known before it."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from datetime import UTC, datetime

import numpy as np

from electrolog.answers import figures as made
from electrolog.answers import kept_backtest
from electrolog.answers.answer import Answer
from electrolog.answers.fitting import whole_cohort
from electrolog.answers.hindsight import Foresight, History, Target, before, past_of, targets_of
from electrolog.errors import DataError, InputError
from electrolog.fouling.cohort import fit_cohort
from electrolog.fouling.forecast import Posterior, posterior
from electrolog.fouling.next_reading import reading_sd
from electrolog.judge import backtest, odds, scores
from electrolog.judge.backtest import FitVerdicts, Past, Predictive, Scored, Targets, fit_verdicts
from electrolog.judge.limits import LimitRow, Limits, effective
from electrolog.judge.mixed_rival import linear_mixed
from electrolog.record import queries
from electrolog.record.store import Connection, Record

CUTS = 4
MOST_CUTS = 50
FIRST_SHARE = 0.3  # of the targets lie before the first cut, so that the first fit has something to rest on
FEWEST_TARGETS = 12
OURS = "electrolog"
RIVALS: dict[str, Callable[[Past, Targets], Predictive]] = {
    "last value": backtest.last_value,
    "own line": backtest.own_line,
    "linear mixed model": linear_mixed,
    "cohort mean": backtest.cohort_mean,
}


@dataclass(frozen=True)
class Cut:
    """A moment at which the cohort was fitted anew, with how much it saw and how many calibrations it forecast."""

    at: datetime
    probes: int
    calibrations: int
    forecast: int
    converged: bool


@dataclass(frozen=True)
class Forecast:
    """One calibration that was hidden: quantiles of what its reading would be (nA/µM), and what it was."""

    electrode: str
    waveform: str
    calibration: str
    at: datetime
    cut: datetime
    own_calibrations: int
    reading_na_um: float
    low_na_um: float
    median_na_um: float
    high_na_um: float
    pit: float
    crps: float


@dataclass(frozen=True)
class Backtest(Answer):
    """methods: electrolog first, then its rivals, on the same readings. verdicts: None where no_verdicts says why."""

    analyte: str
    cuts: tuple[Cut, ...]
    methods: tuple[Scored, ...]
    verdicts: FitVerdicts | None
    no_verdicts: str
    forecasts: tuple[Forecast, ...]
    notes: tuple[str, ...]


@dataclass(frozen=True)
class _Window:
    """The targets between two cuts, with what was known and what was forecast."""

    cut: Cut
    targets: list[Target]
    known: Foresight
    forecasts: dict[str, Predictive]
    log_end: backtest.Array
    log_reference: backtest.Array


def backtested(
    record: Record, analyte: str, cuts: int = CUTS, progress: Callable[[str, int], None] | None = None
) -> Backtest:
    """Kept for reports. Raises UnknownName; InputError for an impossible count of cuts; DataError where there is too
    little to test.
    """
    if not 1 <= cuts <= MOST_CUTS:
        raise InputError(f"cuts: {cuts} is out of range; accepted: 1 to {MOST_CUTS}")
    state = kept_backtest.State.of(record, analyte)
    with record.reading() as connection:
        asked = whole_cohort(connection, analyte)
        limits = _limits(connection, asked.analyte)
        found = queries.calibrations(connection, None, asked.analyte_id)
        probes, life = queries.probes(connection), queries.events(connection)
    history = History(asked.analyte, probes, life, made.all_figures(record, found))
    targets = targets_of(history.known())
    windows = []
    for cut, own in _windows(targets, cuts):
        if progress is not None:
            progress(f"calibrations forecast from {cut.date().isoformat()} on", len(own))
        windows.append(_window(history, cut, own))
    tested = _scored(asked.analyte, windows, limits, len(targets))
    kept_backtest.keep(record, tested, state)
    return tested


def _limits(connection: Connection, analyte: str) -> Limits:
    rows = queries.limits(connection)
    held = [LimitRow(r["rule"], r["value"], r["origin"], r["analyte"] or "", r["project"] or "") for r in rows]
    return effective(held, analyte=analyte)


def _windows(targets: Sequence[Target], cuts: int) -> list[tuple[datetime, list[Target]]]:
    """Cuts at the start of a day, so that no fit has seen a part of a day that it is to forecast."""
    first = round(FIRST_SHARE * len(targets))
    if len(targets) - first < FEWEST_TARGETS:
        raise DataError(
            f"too little to test on: calibrations that follow an earlier one of the same probe and waveform:"
            f" {len(targets)}; needed are {round(FEWEST_TARGETS / (1 - FIRST_SHARE))} or more",
            "calibrate after every run: each adds one",
        )
    places = {first + k * (len(targets) - first) // cuts for k in range(cuts)}
    moments = sorted({_day_of(targets[place].event.at) for place in places})
    ends = [*moments[1:], datetime.max.replace(tzinfo=UTC)]
    found = [
        (cut, [target for target in targets if cut <= target.event.at < end])
        for cut, end in zip(moments, ends, strict=True)
    ]
    return [window for window in found if window[1]]


def _day_of(moment: datetime) -> datetime:
    return moment.astimezone(UTC).replace(hour=0, minute=0, second=0, microsecond=0)


def _window(history: History, at: datetime, targets: list[Target]) -> _Window:
    cohort = history.known_before(at)
    fit = fit_cohort(cohort.events)
    known = before(targets, history)
    drawn = posterior(fit, known.events)
    log_end = drawn.log_sensitivity(np.zeros((len(targets), len(known.events.settings))))
    kinds = {target.waveform: int(kind) for target, kind in zip(targets, known.targets.kind, strict=True)}
    past = past_of(cohort, kinds)
    ours = Predictive(log_end, np.broadcast_to(reading_sd(fit, drawn), log_end.shape))
    rivals = {name: method(past, known.targets) for name, method in RIVALS.items()}
    cut = Cut(at, len({label for label, _ in cohort.units}), fit.n_readings, len(targets), fit.converged)
    return _Window(cut, targets, known, {OURS: ours, **rivals}, log_end, _reference_draws(drawn, known))


def _reference_draws(drawn: Posterior, known: Foresight) -> backtest.Array:
    """(N, D); NaN where a probe has no reference: it was made new since its last calibration."""
    found = drawn.log_sensitivity_at_reading(np.maximum(known.reference, 0))
    return np.where((known.reference >= 0)[:, None], found, np.nan)


def _scored(analyte: str, windows: Sequence[_Window], limits: Limits, every: int) -> Backtest:
    reading = np.concatenate([window.known.reading for window in windows])
    forecasts = {name: backtest.joined([w.forecasts[name] for w in windows]) for name in (OURS, *RIVALS)}
    methods = tuple(backtest.score(name, forecast, reading) for name, forecast in forecasts.items())
    verdicts, why_none = _verdicts(windows, limits)
    return Backtest(
        analyte,
        tuple(window.cut for window in windows),
        methods,
        verdicts,
        why_none,
        tuple(_told(windows, methods[0], forecasts[OURS].draws())),
        _notes(windows, len(reading), every),
    )


def _told(windows: Sequence[_Window], ours: Scored, draws: backtest.Array) -> list[Forecast]:
    pairs = [(window, target) for window in windows for target in window.targets]
    quantiles = np.exp(np.quantile(draws, odds.QUANTILES, axis=1)).T
    reading = np.exp(np.concatenate([window.known.reading for window in windows]))
    return [
        Forecast(
            electrode=target.electrode,
            waveform=target.waveform,
            calibration=target.event.row["calibration"],
            at=target.event.at,
            cut=window.cut.at,
            own_calibrations=len(target.earlier),
            reading_na_um=float(reading[k]),
            low_na_um=float(quantiles[k, 0]),
            median_na_um=float(quantiles[k, 1]),
            high_na_um=float(quantiles[k, 2]),
            pit=float(ours.pit[k]),
            crps=float(ours.crps_each[k]),
        )
        for k, (window, target) in enumerate(pairs)
    ]


def _verdicts(windows: Sequence[_Window], limits: Limits) -> tuple[FitVerdicts | None, str]:
    """By the odds alone: how old a calibration may be, and what it measured by itself, are not asked here."""
    risk, ends = limits.accepted_risk(), odds.EndLimits.of(limits, None)
    if risk is None or not ends.by_rule:
        return None, "no verdict to test: accepted-risk and a least share left or a highest detection limit aren't set"
    counted = [_verdicts_in(window, ends, risk.value) for window in windows]
    runs, fit, wrong = (sum(getattr(one, name) for one in counted) for name in ("runs", "fit", "wrong"))
    low, high = scores.share_interval(wrong, fit)
    return FitVerdicts(runs, fit, wrong, sum(one.expected for one in counted), low, high), ""


def _verdicts_in(window: _Window, ends: odds.EndLimits, risk: float) -> FitVerdicts:
    ran = window.known.ran
    own = window.known.targets.own_reading
    noise = np.array([target.earlier[-1].row["noise_na"] or np.nan for target in window.targets])
    shown = np.array([_own(row, which) for row, which in zip(own, window.known.reference, strict=True)])
    least = _least(window.log_reference, noise[:, None], ends)
    least_reading = _least(shown[:, None], noise[:, None], ends)[:, 0]
    draws = window.forecasts[OURS].draws()
    return fit_verdicts(
        window.log_end[ran], least[ran], risk, window.known.reading[ran], least_reading[ran], draws[ran]
    )


def _own(readings: backtest.Array, which: int) -> float:
    """An own reading by its number; in front of them stand NaN."""
    known = readings[np.isfinite(readings)]
    return float(known[which]) if which >= 0 else float("nan")


def _least(log_reference: backtest.Array, noise_na: backtest.Array, ends: odds.EndLimits) -> backtest.Array:
    """NaN where any limit that is set can't be told: `fit` would be a guess there."""
    untold = np.zeros(log_reference.shape, dtype=bool)
    if odds.SHARE in ends.by_rule:
        untold |= np.isnan(log_reference)
    if odds.LOD in ends.by_rule:
        untold |= np.isnan(noise_na)
    least = odds.least_log_sensitivity(odds.Beside(log_reference, noise_na), ends)
    return np.where(untold, np.nan, np.nan if least is None else least)


def _notes(windows: Sequence[_Window], used: int, every: int) -> tuple[str, ...]:
    said = [f"{used} of {every} calibrations that follow an earlier one are forecast; the others taught the first fit"]
    stuck = [window.cut.at.date().isoformat() for window in windows if not window.cut.converged]
    if stuck:
        said.append(f"the fit did not converge at {', '.join(stuck)}: look at `electrolog fit`")
    return tuple(said)
