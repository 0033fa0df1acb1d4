"""The shelf before a planned run: every usable probe, best first, by one forecast for all of them."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from datetime import datetime

from electrolog.answers import fits
from electrolog.answers import life as lives
from electrolog.answers.asked import Asked, Floats, Run, ask
from electrolog.answers.checking import Demands, calibration_facts, rules_of_the_lab
from electrolog.answers.cohorts import coating
from electrolog.answers.standing import out_of_use, unanswerable
from electrolog.judge.decision import UNDETERMINED
from electrolog.judge.facts import Reason
from electrolog.judge.shelf import Shelf, Standing, judge_shelf
from electrolog.record.store import Record


@dataclass(frozen=True)
class Ranked:
    """A probe's place before the run. The figures are medians at the run's end; None: unknown."""

    electrode: str
    verdict: str
    reasons: tuple[Reason, ...]
    p_breach: float | None
    end_sensitivity_na_um: float | None
    end_fraction_left: float | None
    end_lod_um: float | None
    batch: str | None
    coating: str


@dataclass(frozen=True)
class Ranking:
    """notes: what holds for all of them alike. draws: how finely the odds were counted."""

    probes: tuple[Ranked, ...]
    notes: tuple[str, ...]
    draws: int


def ranking(
    record: Record, labels: Sequence[str] | None, run: Run, demands: Demands, moment: datetime | None = None
) -> Ranking:
    """The named probes (None: every one that isn't retired), best first: by verdict, then by odds."""
    asked = ask(record, labels, run, moment)
    shelf = shelf_of(record, asked, run, demands)
    why = {label: reason for label in asked.labels if (reason := unanswerable(asked, label)) is not None}
    standings = judge_shelf(shelf) if asked.labels else []
    ranked = [_ranked(asked, standing) for standing in standings if asked.labels[standing.probe] not in why]
    aside = [_unanswered(asked, label, reason) for label, reason in why.items()]
    draws = shelf.reference_log_sensitivity.shape[1]
    return Ranking((*ranked, *aside), asked.fit.notes, draws)


def shelf_of(record: Record, asked: Asked, run: Run, demands: Demands) -> Shelf:
    """All probes asked about as one question to the judge."""
    limits, standards = rules_of_the_lab(record, asked, demands)

    def log_sensitivity_at(run_min: float) -> Floats:
        return asked.posterior.log_sensitivity(asked.extra_hours(run_min))

    return Shelf(
        run_min=run.run_min,
        log_sensitivity_at=log_sensitivity_at,
        limits=limits,
        calibrations=[calibration_facts(asked, label, standards) for label in asked.labels],
        reference_log_sensitivity=asked.log_references(),
        uses=[lives.state(asked.life[label], asked.moment).uses for label in asked.labels],
        out_of_use=[out_of_use(label, asked.life[label], asked.moment) for label in asked.labels],
        reading_sd_log=fits.reading_sd_log(asked.fit),
        needs_um=demands.needs_um,
        assay=asked.assay.said,
    )


def _ranked(asked: Asked, standing: Standing) -> Ranked:
    label = asked.labels[standing.probe]
    return Ranked(
        label,
        standing.verdict,
        standing.reasons,
        standing.p_breach,
        standing.sensitivity_na_um,
        standing.fraction_left,
        standing.lod_um,
        asked.probes[label]["batch"],
        coating(asked.life[label]),
    )


def _unanswered(asked: Asked, label: str, reason: Reason) -> Ranked:
    film = coating(asked.life[label])
    return Ranked(label, UNDETERMINED, (reason,), None, None, None, None, asked.probes[label]["batch"], film)
