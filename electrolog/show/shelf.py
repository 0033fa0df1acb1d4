"""The shelf as a table."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import fields

from electrolog.answers.shelf import Shelved
from electrolog.judge.words import shown_share
from electrolog.show.machine import plain, print_csv, print_json
from electrolog.show.tables import day_or_never, print_lines, print_table, with_error
from electrolog.show.terminal import Drawing, trend
from electrolog.units import counted, shown_number

_COLUMNS = ("probe", "state", "batch", "coating", "age (d)", "exposed (h)", "uses", "calibrated", "nA/µM", "left")
_LEAST = ("batch", "age (d)", "uses", "coating", "calibrated", "exposed (h)")
_TREND = "trend"


def answer(probes: Sequence[Shelved], json: bool, csv: bool, how: Drawing = Drawing.NONE) -> None:
    if json:
        print_json(probes)
    elif csv:
        print_csv([plain(probe) for probe in probes], [column.name for column in fields(Shelved)])
    elif not probes:
        print_lines("no probe matches")
    elif how is Drawing.PLAIN:
        print_lines(*[_sentence(probe) for probe in probes], counted(len(probes), "probe"))
    else:
        _print(probes, how)


def _print(probes: Sequence[Shelved], how: Drawing) -> None:
    numeric = ("age (d)", "exposed (h)", "uses", "left")
    drawn = how is Drawing.CHART
    rows = [(*_row(probe), trend(probe.trend_na_um)) if drawn else _row(probe) for probe in probes]
    print_table((*_COLUMNS, _TREND) if drawn else _COLUMNS, rows, numeric, _LEAST)
    print_lines(counted(len(probes), "probe"))
    if drawn and any(len(probe.trend_na_um) > 1 for probe in probes):
        print_lines("trend: the last calibrations, oldest first; a full block is the probe's own highest, none is zero")


def _sentence(probe: Shelved) -> str:
    """One line per probe: a table read aloud loses its columns."""
    cells = zip(_COLUMNS[1:], _row(probe)[1:], strict=True)
    return f"{probe.electrode}: " + ", ".join(f"{name} {value}" for name, value in cells if value not in (None, ""))


def _row(probe: Shelved) -> tuple[object, ...]:
    return (
        probe.electrode,
        f"{probe.state} ({probe.reason})" if probe.reason else probe.state,
        probe.batch,
        probe.coating or "none",
        probe.age_days,
        shown_number(probe.exposure_h),
        probe.uses,
        day_or_never(probe.last_calibration),
        "" if probe.last_calibration is None else with_error(probe.sensitivity_na_um, probe.sensitivity_se_na_um),
        "" if probe.share_left is None else shown_share(probe.share_left),
    )
