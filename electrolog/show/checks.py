"""The verdict for a person and for a program."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from typing import Any

from electrolog.answers.asked import Run
from electrolog.answers.checking import Checked
from electrolog.judge.verdict import NowAndEnd, Spread, Verdict
from electrolog.judge.words import chance, shown_share
from electrolog.show.machine import plain, print_csv, print_json
from electrolog.show.tables import print_lines, print_table
from electrolog.units import shown_concentration, shown_duration, shown_number

SIGNS = {"fit": "[+]", "recalibrate": "[~]", "retire": "[x]", "undetermined": "[?]"}
_COLUMNS = ("probe", "verdict", "odds", "longest run")
Show = Callable[[float | None], str]
FIGURES: tuple[tuple[str, str, Show], ...] = (
    ("sensitivity (nA/µM)", "sensitivity_na_um", shown_number),
    ("share left", "fraction_left", shown_share),
    ("detection limit", "lod_um", shown_concentration),
)
CAUTION = "Advice for people who decide: approved protocol and local rules come first. Never for clinical decisions."


def answer(found: Sequence[Checked], run: Run, json: bool, csv: bool) -> None:
    if json:
        print_json([as_dict(one) for one in found])
    elif csv:
        print_csv([plain(as_dict(one)) for one in found])
    elif not found:
        print_lines("no probe to check")
    else:
        if len(found) > 1:
            print_table(_COLUMNS, [_row(one) for one in found], ("odds", "longest run"))
            print_lines("")
        for one in found:
            print_lines(*sentences(one, run))
        print_lines(CAUTION)


def _row(one: Checked) -> tuple[object, ...]:
    verdict = one.verdict
    longest = "" if verdict.longest_run_min is None else shown_duration(verdict.longest_run_min)
    sign = f"{SIGNS[verdict.verdict]} {verdict.verdict}"
    return one.electrode, sign, odds_shown(verdict.p_breach), longest


def as_dict(one: Checked) -> dict[str, Any]:
    verdict = one.verdict
    return {
        "electrode": one.electrode,
        **verdict.to_dict(),
        "p_breach_now": verdict.p_breach_now,
        "p_by_rule": dict(verdict.p_by_rule),
        "changes": verdict.changes,
        "value_of_calibration": verdict.value_of_calibration,
        "notes": one.notes,
    }


def sentences(one: Checked, run: Run) -> list[str]:
    verdict = one.verdict
    head = f"{SIGNS[verdict.verdict]} {one.electrode}: {verdict.verdict.upper()}"
    head += f" for {shown_duration(run.run_min)} {run.setting}"
    if verdict.p_breach is not None:
        head += f"; odds of breaking a limit {odds_shown(verdict.p_breach)}"
    return [head, *[f"  {line}" for line in (*_because(verdict), *_numbers(verdict), *_notes(one))]]


def odds_shown(p: float | None) -> str:
    """Odds come from a finite number of draws: none that breaks is no proof that none can."""
    return "" if p is None else chance(p)


def _because(verdict: Verdict) -> list[str]:
    said = [f"because {reason.text}" for reason in verdict.reasons]
    if verdict.longest_run_min is not None:
        said.append(f"longest run that stays fit: {shown_duration(verdict.longest_run_min)}")
    return said + [f"what would change it: {change.text}" for change in verdict.changes]


def _numbers(verdict: Verdict) -> list[str]:
    found = [(name, getattr(verdict, field), show) for name, field, show in FIGURES]
    return [f"{name}: {_both(value, show)}" for name, value, show in found if value.now and value.end]


def _both(value: NowAndEnd, show: Show) -> str:
    """`12.1 [10.4 to 13.9] now, 9.8 [7.7 to 12.0] at the end`: median and 90 % interval."""
    parts = (("now", value.now), ("at the end", value.end))
    return ", ".join(f"{spread_shown(spread, show)} {word}" for word, spread in parts if spread is not None)


def spread_shown(spread: Spread, show: Show) -> str:
    low, middle, high = spread
    return f"{show(middle)} [{show(low)} to {show(high)}]"


def _notes(one: Checked) -> list[str]:
    return [f"! {note}" for note in one.notes]
