"""What was put into a recording or beside it."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING

from electrolog.clock import shown_moment
from electrolog.show.checks import CAUTION, SIGNS, odds_shown
from electrolog.show.machine import print_json
from electrolog.show.tables import print_lines
from electrolog.units import shown_number

if TYPE_CHECKING:
    from electrolog.answers.recordings.factor import Factor
    from electrolog.answers.recordings.wanted import Enclosed
    from electrolog.judge.verdict import Verdict


def answer(found: Enclosed, recording: Path, json: bool) -> None:
    if json:
        factor = None if found.factor is None else {**vars(found.factor), "in_force": found.factor.in_force}
        verdict = None if found.verdict is None else found.verdict.to_dict()
        print_json({**vars(found), "factor": factor, "verdict": verdict})
    else:
        print_lines(*_sentences(found, recording))


def _sentences(found: Enclosed, recording: Path) -> list[str]:
    target = Path(found.target)
    beside = target.is_relative_to(recording.parent)
    place = (target.relative_to(recording.parent) if beside else target).as_posix()
    in_place = target.name == recording.name
    untouched = "" if in_place else f"; {recording.name} itself is untouched"
    rows = ", ".join(f"{name.replace('_', ' ')} {count}" for name, count in found.tables.items())
    lines = [f"the papers of {found.electrode} are in {place}{untouched}", f"  rows: {rows}"]
    if found.factor is not None:
        lines += [f"  {line}" for line in _of_factor(found.factor)]
    if found.verdict is not None:
        lines += [f"  {line}" for line in _of_verdict(found.verdict)]
    if found.series:
        lines.append(f"  converted: {', '.join(found.series)}")
    return [*lines, *[f"! {warning}" for warning in found.warnings], *([CAUTION] if found.verdict else [])]


def _of_factor(factor: Factor) -> list[str]:
    low, high = shown_number(factor.low_na_um), shown_number(factor.high_na_um)
    interval = f"95 % interval {low} to {high}" if factor.low_na_um is not None else "its interval is unknown"
    said = f"factor {shown_number(factor.sensitivity_na_um)} nA/µM ({interval}), {factor.calibration}"
    said += f" of {shown_moment(factor.at)}, {shown_number(factor.age_h)} h old when the run began"
    if factor.void_because:
        return [said, f"! not in force: since then {'; '.join(factor.void_because)}"]
    if factor.valid_until is None:
        return [said, "how old it may be the lab hasn't said: electrolog limits set oldest-calibration"]
    if not factor.in_force:
        return [said, f"! not in force: it held until {shown_moment(factor.valid_until)}"]
    return [f"{said}; in force until {shown_moment(factor.valid_until)}"]


def _of_verdict(verdict: Verdict) -> list[str]:
    odds = "" if verdict.p_breach is None else f"; odds of breaking a limit {odds_shown(verdict.p_breach)}"
    head = f"verdict {SIGNS[verdict.verdict]} {verdict.verdict.upper()}{odds}"
    return [head, *[f"  because {reason.text}" for reason in verdict.reasons]]
