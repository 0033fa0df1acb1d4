"""Control charts as tables."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

from electrolog.answers.controlling import Controlled
from electrolog.clock import shown_moment
from electrolog.show.machine import plain, print_csv, print_json
from electrolog.show.tables import print_lines, print_table
from electrolog.units import shown_number

_COLUMNS = ("calibration", "when", "value", "range", "EWMA", "CUSUM +", "CUSUM −", "signal")


def answer(found: Sequence[Controlled], json: bool, csv: bool) -> None:
    if json:
        print_json([as_dict(one) for one in found])
    elif csv:
        print_csv([{"rig": one.rig, **plain(row)} for one in found for row in rows(one)])
    else:
        for one in found:
            _print(one)


def as_dict(one: Controlled) -> dict[str, Any]:
    single, ranges = one.individuals, one.moving_range
    return {
        "rig": one.rig,
        "quantity": one.what,
        "unit": one.unit,
        "baseline": one.baseline,
        "centre": single.centre,
        "lower": single.lower[0],
        "upper": single.upper[0],
        "range_upper": ranges.upper[0],
        "cusum_limit": one.cusum.limit,
        "points": rows(one),
        "in_control": not one.signals,
        "notes": list(one.notes),
    }


def rows(one: Controlled) -> list[dict[str, Any]]:
    return [
        {
            "calibration": point.calibration,
            "electrode": point.electrode,
            "at": point.at,
            "value": point.value,
            "moving_range": one.moving_range.statistic[place - 1] if place else None,
            "ewma": one.ewma.statistic[place + 1],
            "ewma_lower": one.ewma.lower[place + 1],
            "ewma_upper": one.ewma.upper[place + 1],
            "cusum_high": one.cusum.high[place],
            "cusum_low": one.cusum.low[place],
            "signals": [rule for at, rule in one.signals if at == place],
        }
        for place, point in enumerate(one.points)
    ]


def _print(one: Controlled) -> None:
    single = one.individuals
    low, high = shown_number(float(single.lower[0])), shown_number(float(single.upper[0]))
    print_lines(f"{one.rig}: {one.what}, {shown_number(single.centre)} {one.unit}, limits {low} to {high}")
    table = [
        (
            row["calibration"],
            shown_moment(row["at"]),
            *[shown_number(row[name]) if row[name] is not None else "" for name in ("value", "moving_range", "ewma")],
            *[shown_number(row[name]) for name in ("cusum_high", "cusum_low")],
            "; ".join(row["signals"]),
        )
        for row in rows(one)
    ]
    print_table(_COLUMNS, table, _COLUMNS[2:7], ("CUSUM −", "CUSUM +", "range", "EWMA"), "signal")
    last = f"{len(one.signals)} signals" if one.signals else "in control: no rule is broken"
    print_lines(f"  {last}", *[f"  ! {note}" for note in one.notes])
