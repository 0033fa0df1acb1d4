"""A week's assignment: which probe for which run."""

from __future__ import annotations

from datetime import tzinfo

from electrolog.answers.assigning import Assignment, Placed
from electrolog.clock import shown_moment
from electrolog.judge.words import chance
from electrolog.show.checks import CAUTION
from electrolog.show.machine import plain, print_csv, print_json
from electrolog.show.tables import print_lines, print_table
from electrolog.units import shown_duration

COLUMNS = ("run", "start", "length", "analyte", "waveform", "setting", "probe", "odds of success", "used before")
_LEAST = ("used before", "waveform", "analyte", "setting", "length")


def answer(found: Assignment, zone: tzinfo | None, json: bool, csv: bool) -> None:
    if json:
        print_json(found)
    elif csv:
        print_csv([plain(run) for run in found.runs])
    else:
        by_time = sorted(found.runs, key=lambda run: (run.start, run.label))
        print_table(COLUMNS, [row(run, zone) for run in by_time], ("length", "odds of success"), _LEAST)
        print_lines(*said_of(found), *[f"! {note}" for note in found.notes], CAUTION)


def row(run: Placed, zone: tzinfo | None) -> tuple[object, ...]:
    return (
        run.label,
        shown_moment(run.start, zone),
        shown_duration(run.duration_min),
        run.analyte,
        run.waveform,
        run.setting,
        run.electrode or "nobody",
        "" if run.p_success is None else chance(run.p_success),
        shown_duration(run.used_before_min) if run.used_before_min else "",
    )


def said_of(found: Assignment) -> list[str]:
    served = [run for run in found.runs if run.electrode is not None]
    said = [f"{len(served)} of {len(found.runs)} runs served"]
    if found.p_all is not None:
        said[0] += f"; odds that all of these succeed {chance(found.p_all)}"
    said += [f"run {run.label}: {run.why}" for run in found.runs if run.electrode is None]
    return [*said, "calibrate each probe anew before its run, and let `electrolog check` decide then"]
