"""The lab's part of a report: shelf, this week, batches and how probes foul."""

from __future__ import annotations

from typing import Any

from electrolog.answers.fitting import Day, FittedCohort
from electrolog.answers.ranking import Ranked
from electrolog.answers.report import BatchSheet, CohortSheet, LabSheet
from electrolog.answers.shelf import STATES, Shelved
from electrolog.clock import shown_moment
from electrolog.fouling.typical import TypicalLoss
from electrolog.judge.scores import share_interval
from electrolog.judge.words import shown_share
from electrolog.show.checks import SIGNS, odds_shown
from electrolog.show.fits import hours_shown, off_shown, span_shown
from electrolog.show.outlook import said_of
from electrolog.show.page_backtest import tested_context
from electrolog.show.page_charts import days_chart, loss_chart
from electrolog.show.svg import trend_path
from electrolog.show.tables import day_or_never, named, with_error
from electrolog.units import shown_concentration, shown_number, shown_percent

_COLUMNS = (
    ("probe", False),
    ("state", False),
    ("batch", False),
    ("coating", False),
    ("maker", False),
    ("age (d)", True),
    ("exposed (h)", True),
    ("uses", True),
    ("calibrated", False),
    ("nA/µM", True),
    ("left", True),
)
_LEAST_WEIGHT = 0.01
_LEFT_ROWS = 8


def lab_context(lab: LabSheet) -> dict[str, Any]:
    return {
        "columns": _COLUMNS,
        "states": STATES,
        "shelf": [_row(one) for one in lab.shelf],
        "week": _week(lab),
        "verdicts": [_verdict(one) for one in lab.verdicts],
        "batches": [_batch(one) for one in lab.batches],
        "cohorts": [_cohort(one, f"a{place}") for place, one in enumerate(lab.cohorts)],
        "tested": [tested_context(one, f"b{place}") for place, one in enumerate(lab.tested)],
        "untested": lab.untested,
        "without_fit": ", ".join(lab.without_fit),
    }


def _row(one: Shelved) -> dict[str, Any]:
    trend = trend_path(one.trend_na_um)
    values = [shown_number(value) for value in one.trend_na_um[-8:]]
    return {
        "name": one.electrode,
        "state": one.state,
        "trend": trend,
        "said": f"{', '.join(values)} nA/µM" if trend else "",
        "cells": [
            (f"{one.state} ({one.reason})" if one.reason else one.state, "", False),
            (one.batch or "", "", False),
            (one.coating or "none", "", False),
            (one.made_by or "", "", False),
            _number(one.age_days, "" if one.age_days is None else str(one.age_days)),
            _number(one.exposure_h, shown_number(one.exposure_h)),
            _number(one.uses, str(one.uses)),
            (day_or_never(one.last_calibration), "", False),
            _number(
                one.sensitivity_na_um,
                "" if one.last_calibration is None else with_error(one.sensitivity_na_um, one.sensitivity_se_na_um),
            ),
            _number(one.share_left, "" if one.share_left is None else shown_share(one.share_left)),
        ],
    }


def _number(value: float | None, shown: str) -> tuple[str, str, bool]:
    return shown, "" if value is None else f"{value:.6g}", True


def _week(lab: LabSheet) -> list[str]:
    by_verdict = {verdict: [one.electrode for one in lab.verdicts if one.verdict == verdict] for verdict in SIGNS}
    lines = [f"{verdict}: {named(labels, 40)}" for verdict, labels in by_verdict.items() if labels]
    return [*lines, *(said_of(lab.outlook) if lab.outlook else [f"How many to make: {lab.no_outlook}."])]


def _verdict(one: Ranked) -> tuple[str, ...]:
    because = "; ".join(reason.text for reason in one.reasons)
    left, lod = shown_share(one.end_fraction_left), shown_concentration(one.end_lod_um)
    return one.electrode, f"{SIGNS[one.verdict]} {one.verdict}", odds_shown(one.p_breach), left, lod, because


def _batch(one: BatchSheet) -> tuple[object, ...]:
    share = "can't be told yet"
    if one.told:
        low, high = share_interval(one.served, one.told)
        share = f"{one.served} of {one.told}, {shown_percent(one.served / one.told)}"
        share += f" [{shown_percent(low)} to {shown_percent(high)}]"
    made_on = "" if one.made_on is None else one.made_on.isoformat()
    return one.batch, made_on, one.made_by or "", one.fibre or "", one.probes, one.retired, share


def _cohort(one: CohortSheet, id_: str) -> dict[str, Any]:
    fit = one.fit
    return {
        "id": id_,
        "analyte": one.analyte,
        "said": _said(fit),
        "left_columns": ("kind", "hours in vivo", "5 %", "median", "95 %"),
        "left": [row for loss in one.typical for row in _left(loss)],
        "losses": [(loss_chart(loss, fit.shapes), f"{id_}l{place}") for place, loss in enumerate(one.typical)],
        "half_lives": [
            (row.coating, row.waveform, span_shown(row.hours, hours_shown), row.probes, row.calibrations)
            for row in fit.half_lives
        ],
        "recoveries": [
            (row.method, span_shown(row.share, shown_percent), row.times, row.probes) for row in fit.recoveries
        ],
        "days": days_chart(fit.days),
        "days_id": f"{id_}d",
        "suspicious": [_day(day) for day in fit.suspicious_days],
        "every_day": [_day(day) for day in fit.days],
    }


def _left(loss: TypicalLoss) -> list[tuple[str, ...]]:
    kind = f"{'bare' if loss.coating == 'none' else loss.coating}, {loss.waveform}"
    steps = range(0, len(loss.hours), max(1, len(loss.hours) // _LEFT_ROWS))
    held = [(loss.hours[k], *(100.0 * part[k] for part in (loss.low, loss.median, loss.high))) for k in steps]
    return [(kind, *(shown_number(float(value)) for value in row)) for row in held]


def _said(fit: FittedCohort) -> list[str]:
    shapes = ", ".join(f"{name} {shown_percent(w)}" for name, w in fit.shapes.items() if w >= _LEAST_WEIGHT)
    said = [
        f"{fit.calibrations} calibrations of {fit.probes} probes, retired ones too; fitted {shown_moment(fit.made_at)} "
        f"by {fit.method}. Shapes of loss: {shapes}."
    ]
    said += [] if fit.converged else ["The fit did not converge: these numbers are not to be relied on."]
    said += [f"{odd.calibration} of {odd.electrode} looks like a slip of a unit or a decimal." for odd in fit.slips]
    said += [f"{odd.electrode} looks suddenly damaged before {odd.calibration}." for odd in fit.damaged]
    return [*said, *fit.notes]


def _day(day: Day) -> tuple[object, ...]:
    return day.date, day.standard, day.rig, span_shown(day.effect, off_shown), day.calibrations
