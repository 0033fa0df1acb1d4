"""The backtest for a person and for a program."""

from __future__ import annotations

from typing import Any

from electrolog.answers.backtesting import Backtest
from electrolog.judge.backtest import PIT_CLASSES, FitVerdicts, Scored
from electrolog.show.machine import plain, print_csv, print_json
from electrolog.show.tables import print_lines, print_table
from electrolog.units import shown_number, shown_percent

BAR = 30
_COLUMNS = ("method", "CRPS", "median", "log score", "50 % hold", "80 % hold", "90 % hold", "90 % width")


def answer(found: Backtest, json: bool, csv: bool, in_sentences: bool = False) -> None:
    if json:
        print_json(as_dict(found))
    elif csv:
        print_csv([plain(one) for one in found.forecasts])
    else:
        _print(found, in_sentences)


def as_dict(found: Backtest) -> dict[str, Any]:
    return {
        "analyte": found.analyte,
        "forecasts": len(found.forecasts),
        "cuts": found.cuts,
        "methods": [_method(one) for one in found.methods],
        "verdicts": found.verdicts,
        "no_verdicts": found.no_verdicts or None,
        "notes": found.notes,
    }


def _method(scored: Scored) -> dict[str, Any]:
    return {
        "method": scored.method,
        "crps": scored.crps,
        "crps_median": scored.crps_median,
        "log_score": scored.log_score,
        "coverage": {f"{one.level:g}": one.share for one in scored.coverage},
        "coverage_interval": {f"{one.level:g}": [one.low, one.high] for one in scored.coverage},
        "mean_width": {f"{one.level:g}": one.mean_width for one in scored.coverage},
        "pit_counts": scored.pit_counts,
    }


def _print(found: Backtest, in_sentences: bool) -> None:
    print_lines(
        f"{found.analyte}: {len(found.forecasts)} calibrations, each forecast from what was known before it"
        " (scores in log units: 0.10 is about 10 %; less is better)"
    )
    rows, ours = [_row(one) for one in found.methods], found.methods[0]
    if in_sentences:
        print_lines(*[_sentence(row) for row in rows])
    else:
        print_table(_COLUMNS, rows, _COLUMNS[1:], least=("median", "50 % hold", "80 % hold"))
    print_lines("", f"where {ours.method}'s readings fell in its forecasts (even when they are honest)")
    print_lines(*_bars(ours.pit_counts, 0 if in_sentences else BAR))
    print_lines("", *cuts_said(found), *verdicts_said(found), *[f"! {note}" for note in found.notes])


def _row(scored: Scored) -> tuple[str, ...]:
    held = [shown_percent(one.share) for one in scored.coverage]
    figures = [f"{value:.3f}" for value in (scored.crps, scored.crps_median)]
    return (scored.method, *figures, f"{scored.log_score:.2f}", *held, f"{scored.coverage[-1].mean_width:.2f}")


def _sentence(row: tuple[str, ...]) -> str:
    """A table read aloud loses its columns."""
    return f"{row[0]}: " + ", ".join(f"{name} {value}" for name, value in zip(_COLUMNS[1:], row[1:], strict=True))


def _bars(counts: tuple[int, ...], longest: int) -> list[str]:
    most = max(*counts, 1)
    ends = [f"{k / PIT_CLASSES:.1f}-{(k + 1) / PIT_CLASSES:.1f}" for k in range(PIT_CLASSES)]
    bars = [f"{'#' * round(longest * count / most)} " if longest else "" for count in counts]
    return [f"  {span} {bar}{count}" for span, bar, count in zip(ends, bars, counts, strict=True)]


def cuts_said(found: Backtest) -> list[str]:
    said = [f"{cut.at.date().isoformat()} ({cut.calibrations} calibrations)" for cut in found.cuts]
    return [f"fitted anew on {', '.join(said)}"]


def verdicts_said(found: Backtest) -> list[str]:
    return [found.no_verdicts] if found.verdicts is None else [_fits(found.verdicts)]


def _fits(verdicts: FitVerdicts) -> str:
    if not verdicts.fit:
        return f"of {verdicts.runs} runs that were calibrated after, none would have been called fit by its odds"
    share = shown_percent(verdicts.wrong / verdicts.fit)
    interval = f"{shown_percent(verdicts.low)} to {shown_percent(verdicts.high)}"
    return (
        f"of {verdicts.runs} runs that were calibrated after, {verdicts.fit} would have been called fit by their odds;"
        f" {verdicts.wrong} of these broke a limit by that calibration ({share}, 95 % interval {interval});"
        f" expected {shown_number(verdicts.expected)}, a reading's own error included"
    )
