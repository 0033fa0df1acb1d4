"""How long probes will last, and how many to make."""

from __future__ import annotations

from dataclasses import fields
from datetime import tzinfo

from electrolog.answers.outlook import Lasting, Making, Outlook
from electrolog.clock import shown_moment
from electrolog.judge.words import chance
from electrolog.show.checks import CAUTION
from electrolog.show.machine import plain, print_csv, print_json
from electrolog.show.tables import named, print_lines, print_table
from electrolog.units import shown_number, shown_percent

_COLUMNS = ("probe", "good for (h)", "until about", "breaks after (h)")
_FAR = "over 1000"


def answer(found: Outlook, zone: tzinfo | None, json: bool, csv: bool) -> None:
    if json:
        print_json(found)
    elif csv:
        print_csv([plain(vars(one)) for one in found.probes], [column.name for column in fields(Lasting)])
    else:
        told = [_row(one, zone) for one in found.probes if not one.why]
        if told:
            print_table(_COLUMNS, told, ("good for (h)",), ("until about", "breaks after (h)"))
        print_lines(*_untold(found), *said_of(found), *[f"! {note}" for note in found.notes], CAUTION)


def _row(one: Lasting, zone: tzinfo | None) -> tuple[object, ...]:
    low, middle, high = (_shown(hours) for hours in one.broken_h)
    on = "" if one.accepted_on is None else shown_moment(one.accepted_on, zone)[:10]
    return one.electrode, _shown(one.accepted_h), on, f"{middle} [{low} to {high}]"


def _untold(found: Outlook) -> list[str]:
    """Probes of which nothing can be told, by why: a line of its own for each would bury the others."""
    by_reason: dict[str, list[str]] = {}
    for one in found.probes:
        if one.why:
            by_reason.setdefault(one.why, []).append(one.electrode)
    return [f"can't be told, {why}: {named(labels)}" for why, labels in by_reason.items()]


def _shown(hours: float | None) -> str:
    return _FAR if hours is None else shown_number(hours, 2)


def said_of(found: Outlook) -> list[str]:
    said = ["good for: hours of run until the odds of a breach pass the accepted risk; breaks after: median and 90 %"]
    if found.pace_h_per_day is None:
        said.append("no run in the last 30 days, so hours can't be turned into dates")
    else:
        said.append(f"until about: at the last 30 days' pace, {shown_number(found.pace_h_per_day * 7, 2)} h a week")
    if found.recalibrate_first:
        named_ones = [f"{one.probe} (fit then with odds {chance(one.chance_fit)})" for one in found.recalibrate_first]
        said.append(f"a calibration now is worth most for {', '.join(named_ones)}")
    return said + (_making(found.making) if found.making else [])


def _making(making: Making) -> list[str]:
    to_make, (low, middle, high) = making.to_make, making.to_make.runs_on_shelf
    least, usual, most = (shown_percent(share) for share in to_make.yield_share)
    said = [
        f"to make for {making.planned_runs} runs: {_count(to_make.likely)} would do in half of the cases, "
        f"{_count(to_make.enough)} in nine of ten",
        f"  the shelf will serve {middle:.0f} [{low:.0f} to {high:.0f}] of them",
        f"  yield {usual} [{least} to {most}]: {to_make.said.partition('from ')[2]}",
        f"  reckoned with new probes of the newest kind ({making.new_probe.strip()}); a run loses one by breakage or "
        f"loss with odds {chance(making.p_lost_per_run)}",
    ]
    if making.unproven:
        untried = f"{making.unproven} on the shelf were never calibrated with this"
        said.append(f"  {untried}: calibrate them before making more")
    return said


def _count(number: int | None) -> str:
    return "more than 5000" if number is None else str(number)
