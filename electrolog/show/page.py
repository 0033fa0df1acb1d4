"""The verdicts as one page to pin at the rig: nothing in it is loaded from elsewhere, and it prints on A4."""

from __future__ import annotations

from collections.abc import Sequence
from pathlib import Path
from typing import Any

from electrolog.answers.asked import Run
from electrolog.answers.checking import Checked
from electrolog.answers.report import Origin
from electrolog.clock import shown_moment
from electrolog.judge.limits import Limit, rule_named
from electrolog.judge.verdict import Spread
from electrolog.show.checks import CAUTION, FIGURES, SIGNS, odds_shown, spread_shown
from electrolog.show.limits import shown
from electrolog.show.pages import Inline, origin_said, rendered
from electrolog.units import shown_concentration, shown_duration

CAUTIONS = (CAUTION, "An explanted probe is a biohazard and a sharp: handle and discard it by the local rules.")
_STYLE = """
@page { size: A4; margin: 15mm }
body { font: 11pt/1.4 sans-serif; color: #000; background: #fff; max-width: 180mm; margin: 8mm auto; padding: 0 4mm }
h1 { font-size: 17pt; margin: 0 } h2 { font-size: 14pt; margin: 0 0 2mm } h3 { font-size: 11pt; margin: 2mm 0 0 }
section { border-left: 2mm solid #777; padding: 0 0 0 4mm; margin: 6mm 0; break-inside: avoid }
section.fit { border-left-style: double } section.retire { border-left-color: #000 }
strong { text-transform: uppercase } ul { margin: 1mm 0; padding-left: 5mm }
table { border-collapse: collapse; width: 100%; margin: 2mm 0 }
th, td { text-align: left; padding: 0.5mm 2mm; border-bottom: 0.2mm solid #999; overflow-wrap: anywhere }
.note { margin: 1mm 0; font-style: italic } footer { margin-top: 8mm; border-top: 0.4mm solid #000; font-size: 9pt }
"""


def write_page(path: Path, found: Sequence[Checked], run: Run, asked: dict[str, Any], made: Origin) -> None:
    """`asked`: what the run demands beyond the lab's limits, as it was asked."""
    path.write_text(page(found, run, asked, made), encoding="utf-8", newline="\n")


def page(found: Sequence[Checked], run: Run, asked: dict[str, Any], made: Origin) -> str:
    return rendered(
        "page.html",
        title=f"Before the run: {shown_duration(run.run_min)} {run.setting}",
        run=run,
        needs=None if asked["needs_um"] is None else shown_concentration(asked["needs_um"]),
        project=asked["project"],
        moment=shown_moment(made.made_at),
        origin=origin_said(made),
        probes=[verdict_context(one) for one in found],
        limits=[_limit(limit) for limit in found[0].limits.by_rule.values()] if found else [],
        cautions=CAUTIONS,
        style=Inline(_STYLE),
    )


def verdict_context(one: Checked) -> dict[str, Any]:
    verdict = one.verdict
    return {
        "name": one.electrode,
        "verdict": verdict.verdict,
        "sign": SIGNS[verdict.verdict],
        "odds": odds_shown(verdict.p_breach) or "can't be told",
        "longest": "can't be told" if verdict.longest_run_min is None else shown_duration(verdict.longest_run_min),
        "because": [reason.text for reason in verdict.reasons],
        "changes": [change.text for change in verdict.changes],
        "numbers": [
            (name, _cell(getattr(verdict, field).now, show), _cell(getattr(verdict, field).end, show))
            for name, field, show in FIGURES
            if getattr(verdict, field).now
        ],
        "notes": one.notes,
    }


def _cell(spread: Spread | None, show: Any) -> str:
    return "" if spread is None else spread_shown(spread, show)


def _limit(limit: Limit) -> tuple[str, str, str, str]:
    rule = rule_named(limit.rule)
    return limit.rule, f"{rule.direction} {shown(rule, limit.value)}", limit.scope, limit.origin
