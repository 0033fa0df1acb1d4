"""Why a probe got worse, for a person."""

from __future__ import annotations

from datetime import tzinfo

from electrolog.answers.diagnosing import Diagnosed
from electrolog.clock import shown_moment
from electrolog.judge.diagnosis import UNLIKELY, UNTOLD, Finding
from electrolog.show.machine import print_json
from electrolog.show.tables import print_lines
from electrolog.units import shown_number

_SIGNS = {"likely": "[!]", "possible": "[~]", UNTOLD: "[?]", UNLIKELY: "[ ]"}


def answer(found: Diagnosed, zone: tzinfo | None, json: bool) -> None:
    if json:
        print_json(found)
        return
    print_lines(f"{found.electrode}: {found.diagnosis.said}", *_compared(found, zone))
    for finding in found.diagnosis.findings:
        print_lines(*_sentences(finding))
    print_lines(*[f"! {note}" for note in found.notes])


def _compared(found: Diagnosed, zone: tzinfo | None) -> list[str]:
    ends = (
        (found.before, found.before_at, found.sensitivity_before_na_um),
        (found.after, found.after_at, found.sensitivity_after_na_um),
    )
    return [f"  {label}, {shown_moment(at, zone)}: {shown_number(value)} nA/µM" for label, at, value in ends]


def _sentences(finding: Finding) -> list[str]:
    said = [f"{_SIGNS[finding.judgement]} {finding.cause}: {finding.judgement}"]
    said += [f"  + {text}" for text in finding.evidence_for]
    said += [f"  - {text}" for text in finding.evidence_against]
    return said if finding.judgement in (UNLIKELY, UNTOLD) else [*said, f"  next: {finding.next_step}"]
