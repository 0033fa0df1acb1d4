"""The runs of a folder of recordings: what would be or was logged, what is doubtful or refused, and why."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING

from electrolog.clock import shown_moment
from electrolog.show.machine import print_json
from electrolog.show.tables import print_lines, print_table
from electrolog.units import shown_duration

if TYPE_CHECKING:
    from electrolog.answers.recordings.runs import FoundRun, Runs

MOST_NAMED = 3


def answer(found: Runs, json: bool) -> None:
    if json:
        print_json(found)
        return
    columns = ("state", "file", "probe", "told by", "start", "length", "subject")
    if found.runs:
        print_table(columns, [_row(run) for run in found.runs], least=("told by", "subject"), other_ways=" or --json")
    for kind, states in (("refused", ("refused",)), ("doubtful", ("doubtful",)), ("also", ())):
        _print_said(kind, [run for run in found.runs if _is_of(run, states)])
    print_lines("", *_summary(found))


def listed(path: Path, json: bool) -> None:
    if json:
        print_json({"list": str(path)})
    else:
        print_lines(f"{path} lists the recordings: fill in what is missing, then ask `electrolog runs` again")


def _row(run: FoundRun) -> tuple[object, ...]:
    start = "" if run.start is None else shown_moment(run.start)
    length = "" if run.start is None else shown_duration(run.duration_min)
    return run.state, run.file, run.electrode, run.electrode_from, start, length, run.subject


def _is_of(run: FoundRun, states: tuple[str, ...]) -> bool:
    return run.state in states if states else run.state not in ("refused", "doubtful")


def _print_said(kind: str, chosen: list[FoundRun]) -> None:
    """What holds for several files is said once."""
    files: dict[str, list[str]] = {}
    for run in chosen:
        for text in run.said:
            files.setdefault(text, []).append(run.file)
    if files:
        print_lines("")
        print_table((f"{kind}: file", "why"), [(_named(names), text) for text, names in files.items()], wrapped="why")


def _named(files: list[str]) -> str:
    rest = len(files) - MOST_NAMED
    return ", ".join(files[:MOST_NAMED]) + (f" and {rest} more" if rest > 0 else "")


def _summary(found: Runs) -> list[str]:
    states = dict.fromkeys(run.state for run in found.runs)
    counts = ", ".join(f"{found.count(state)} {state}" for state in states) or "no recording that says when it was made"
    lines = [f"{found.folder}: {counts}", *[f"? {question}" for question in found.questions]]
    if found.unlisted:
        shown = _named(list(found.unlisted))
        lines.append(f"only a list can tell of {shown}: `electrolog runs {found.folder} --list` makes one to fill in")
    if any(run.state == "refused" and not run.electrode for run in found.runs):
        lines.append("a probe that no file names can be typed: --probe FILE=LABEL, or in the list (--list)")
    if found.count("doubtful"):
        lines.append("what is doubtful is written only with --yes")
    if not found.committed:
        lines.append("a dry run: nothing was written; --commit writes what is new, all of it or nothing")
    return lines
