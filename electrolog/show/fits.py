"""A cohort's fit for a person and for a program."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

from electrolog.answers.fitting import Day, Estimate, FittedCohort
from electrolog.clock import shown_moment
from electrolog.show.machine import plain, print_json
from electrolog.show.tables import print_lines, print_table
from electrolog.units import shown_number, shown_percent

_SPREADS = {
    "level_between_probes": "probes differ in level by",
    "log_rate_between_probes": "in rate by",
    "day": "days by",
    "residual": "one reading strays by",
}


def answer(found: FittedCohort, json: bool) -> None:
    if json:
        print_json(as_dict(found))
    else:
        _print(found)


def as_dict(found: FittedCohort) -> dict[str, Any]:
    answer: dict[str, Any] = plain(found)
    return answer | {"suspicious_days": plain(found.suspicious_days)}


def _print(found: FittedCohort) -> None:
    print_lines(*_head(found))
    _print_half_lives(found)
    _print_settings(found)
    _print_recoveries(found)
    _print_days(found)
    print_lines(*_spreads(found), *_odd(found), *[f"! {note}" for note in found.notes])


def _head(found: FittedCohort) -> list[str]:
    shapes = ", ".join(f"{name} {shown_percent(weight)}" for name, weight in found.shapes.items() if weight >= 0.01)
    lines = [
        f"{found.analyte}: {_count(found.calibrations, 'calibration')} of {_count(found.probes, 'probe')},"
        " retired ones too",
        f"fitted {shown_moment(found.made_at)} by {found.method}; median and 90 % interval everywhere",
        f"shape of loss: {shapes}",
    ]
    return lines if found.converged else [*lines, f"! did not converge: look at {_suspects(found)}"]


def _suspects(found: FittedCohort) -> str:
    named = [odd.calibration for odd in (*found.slips, *found.damaged)]
    named += [f"{day.date} ({_who(day)})" for day in found.suspicious_days]
    rest = "exposures without a calibration after them, days that saw one probe alone"
    return f"{', '.join([*dict.fromkeys(named), rest])}; until then these numbers are not to be relied on"


def _print_half_lives(found: FittedCohort) -> None:
    print_lines("", "half-life in vivo of a typical probe")
    columns = ("coating", "waveform", "half-life (h)", "probes", "calibrations")
    rows = [
        (o.coating, o.waveform, span_shown(o.hours, hours_shown), o.probes, o.calibrations) for o in found.half_lives
    ]
    print_table(columns, rows, columns[2:])


def _print_settings(found: FittedCohort) -> None:
    print_lines("", "how fast a setting fouls beside in vivo")
    columns = ("setting", "weight", "hours logged", "probes")
    rows = [
        (o.setting, span_shown(o.weight, shown_number), shown_number(o.exposure_h), o.probes) for o in found.settings
    ]
    print_table(columns, rows, columns[1:])


def _print_recoveries(found: FittedCohort) -> None:
    if not found.recoveries:
        return
    print_lines("", "share of the fouling that a renewal undoes")
    columns = ("renewal", "undone", "times", "probes")
    rows = [(one.method, span_shown(one.share, shown_percent), one.times, one.probes) for one in found.recoveries]
    print_table(columns, rows, columns[1:])


def _print_days(found: FittedCohort) -> None:
    odd = found.suspicious_days
    if not odd:
        print_lines("", f"suspicious: none of {_count(len(found.days), 'calibration day')}")
        return
    which = f"{len(odd)} of {_count(len(found.days), 'calibration day')}"
    print_lines("", f"suspicious: {which}; is it the standard, the rig or the reference electrode?")
    columns = ("date", "standard", "rig", "all readings off by", "calibrations")
    rows = [(day.date, day.standard, day.rig, span_shown(day.effect, off_shown), day.calibrations) for day in odd]
    print_table(columns, rows, columns[3:], least=("rig",), other_ways=" or --json")


def _spreads(found: FittedCohort) -> list[str]:
    said = [f"{_SPREADS[name]} {span_shown(spread, shown_percent)}" for name, spread in found.spreads.items()]
    return ["", f"spread (standard deviations): {'; '.join(said)}"]


def _odd(found: FittedCohort) -> list[str]:
    slips = [f"! {odd.calibration} of {odd.electrode} looks like a slip of a unit or a decimal" for odd in found.slips]
    broken = [f"! {odd.electrode} looks suddenly damaged before {odd.calibration}" for odd in found.damaged]
    return [*slips, *broken]


def span_shown(value: Estimate, shown: Callable[[float | None], str]) -> str:
    if value.low == value.high:
        return shown(value.median)
    return f"{shown(value.median)} [{shown(value.low)}, {shown(value.high)}]"


def hours_shown(hours: float | None) -> str:
    return "never" if hours is None else shown_number(hours)


def off_shown(share: float | None) -> str:
    """A few percent as percent; a slip of a decimal as the factor that it is."""
    if share is None or share > 1:
        return "×?" if share is None else f"×{shown_number(1 + share)}"
    return f"{share * 100:+.1f} %"


def _who(day: Day) -> str:
    return ", ".join(part for part in (day.standard, day.rig) if part) or "standard and rig unknown"


def _count(number: int, what: str) -> str:
    return f"{number} {what}{'' if number == 1 else 's'}"
