"""The shelf as a table."""

from __future__ import annotations

from collections.abc import Sequence

from electrolog.answers.shelf import Shelved
from electrolog.show.machine import plain, print_csv, print_json
from electrolog.show.tables import day_or_never, print_lines, print_table, with_error
from electrolog.units import shown_number, shown_percent

_COLUMNS = ("probe", "state", "batch", "coating", "age (d)", "exposed (h)", "uses", "calibrated", "nA/µM", "left")
_LEAST = ("batch", "age (d)", "uses", "coating", "calibrated", "exposed (h)")


def answer(probes: Sequence[Shelved], json: bool, csv: bool) -> None:
    if json:
        print_json(probes)
    elif csv:
        print_csv([plain(probe) for probe in probes])
    elif not probes:
        print_lines("no probe matches")
    else:
        numeric = ("age (d)", "exposed (h)", "uses", "left")
        print_table(_COLUMNS, [_row(probe) for probe in probes], numeric, _LEAST)
        print_lines(f"{len(probes)} probes")


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
        "" if probe.share_left is None else shown_percent(probe.share_left),
    )
