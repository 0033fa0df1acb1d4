"""The shelf before a planned run: best first, one line per probe."""

from __future__ import annotations

from collections import Counter
from dataclasses import fields
from typing import Any

from electrolog.answers.asked import Run
from electrolog.answers.ranking import Ranked, Ranking
from electrolog.judge.words import shown_share
from electrolog.show.checks import CAUTION, SIGNS, odds_shown
from electrolog.show.machine import plain, print_csv, print_json
from electrolog.show.tables import print_lines, print_table
from electrolog.units import shown_concentration, shown_duration, shown_number

ENOUGH_DRAWS = 500  # below, odds are good to a few points only
MOST_SHOWN = 100  # nobody reads on; the best stand first
_COLUMNS = ("probe", "verdict", "odds", "left at end", "detects", "nA/µM", "batch", "coating", "because")
_LEAST = ("batch", "coating", "nA/µM", "detects", "left at end")


def answer(found: Ranking, run: Run, json: bool, csv: bool) -> None:
    if json:
        probes = [_as_dict(one) for one in found.probes]
        print_json({"probes": probes, "notes": found.notes, "draws": found.draws})
    elif csv:
        print_csv([plain(_as_dict(one)) for one in found.probes], [column.name for column in fields(Ranked)])
    elif not found.probes:
        print_lines("no usable probe on the shelf")
    else:
        print_lines(f"{shown_duration(run.run_min)} {run.setting}, {run.analyte}, {run.waveform}: best first")
        shown = found.probes[:MOST_SHOWN]
        print_table(_COLUMNS, [_row(one) for one in shown], ("odds", "left at end"), _LEAST, "because")
        rest = len(found.probes) - len(shown)
        print_lines(*([f"and {rest} more; --json or --csv shows all"] if rest else []))
        print_lines(_counted(found), *[f"! {note}" for note in found.notes], CAUTION)


def _as_dict(one: Ranked) -> dict[str, Any]:
    return {**vars(one), "reasons": [vars(reason) for reason in one.reasons]}


def _counted(found: Ranking) -> str:
    counts = Counter(one.verdict for one in found.probes)
    said = ", ".join(f"{count} {word}" for word, count in counts.items())
    roughly = f", counted in {found.draws} draws" if found.draws < ENOUGH_DRAWS else ""
    return f"{said}; odds: of breaking a limit by the end{roughly}; `electrolog check PROBE` says more of one"


def _row(one: Ranked) -> tuple[object, ...]:
    return (
        one.electrode,
        f"{SIGNS[one.verdict]} {one.verdict}",
        odds_shown(one.p_breach),
        "" if one.end_fraction_left is None else shown_share(one.end_fraction_left),
        "" if one.end_lod_um is None else shown_concentration(one.end_lod_um),
        "" if one.end_sensitivity_na_um is None else shown_number(one.end_sensitivity_na_um),
        one.batch,
        one.coating,
        "" if one.verdict == "fit" else _because(one),
    )


def _because(one: Ranked) -> str:
    first, *others = [reason.text for reason in one.reasons]
    return f"{first} (and {len(others)} more)" if others else first
