"""The shelf before a planned run: every usable probe, best first, by one forecast for all of them."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from datetime import datetime

from electrolog.answers import fits
from electrolog.answers.answer import Answer
from electrolog.answers.asked import Run
from electrolog.answers.board import Board, board
from electrolog.answers.cards import Card
from electrolog.answers.checking import Demands, limits_in_force
from electrolog.clock import utc_now
from electrolog.judge.decision import UNDETERMINED
from electrolog.judge.facts import Reason
from electrolog.judge.limits import Limits
from electrolog.judge.shelf import Shelf, Standing, judge_shelf
from electrolog.record import queries
from electrolog.record.store import Record


@dataclass(frozen=True)
class Ranked(Answer):
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
class Ranking(Answer):
    """notes: what holds for all of them alike. draws: how finely the odds were counted."""

    probes: tuple[Ranked, ...]
    notes: tuple[str, ...]
    draws: int


def ranking(
    record: Record, labels: Sequence[str] | None, run: Run, demands: Demands, moment: datetime | None = None
) -> Ranking:
    """The named probes (None: every one that isn't retired), best first: by verdict, then by odds."""
    there = board(record, labels, run, moment or utc_now())
    with record.reading() as connection:
        limits = limits_in_force(queries.limits(connection), there, demands)
    standings = judge_shelf(shelf_on(there, run, limits, demands)) if there.cards else []
    known = ((there.cards[standing.probe], standing) for standing in standings)
    ranked = [_ranked(card, standing) for card, standing in known if card.aside is None]
    aside = [_unanswered(card, card.aside) for card in there.cards if card.aside is not None]
    return Ranking((*ranked, *aside), there.fit.notes, there.log_references.shape[1])


def shelf_on(there: Board, run: Run, limits: Limits, demands: Demands) -> Shelf:
    """All probes of the board as one question to the judge."""
    return Shelf(
        run_min=run.run_min,
        log_sensitivity_at=there.log_sensitivity_in(there.setting),
        limits=limits,
        calibrations=[card.at(there.moment) for card in there.cards],
        reference_log_sensitivity=there.log_references,
        uses=[card.uses for card in there.cards],
        out_of_use=[card.out_of_use for card in there.cards],
        reading_sd_log=fits.reading_sd_log(there.fit),
        needs_um=demands.needs_um,
        assay=there.assay.said,
    )


def _ranked(card: Card, standing: Standing) -> Ranked:
    return Ranked(
        card.electrode,
        standing.verdict,
        standing.reasons,
        standing.p_breach,
        standing.sensitivity_na_um,
        standing.fraction_left,
        standing.lod_um,
        card.batch,
        card.coating,
    )


def _unanswered(card: Card, reason: Reason) -> Ranked:
    return Ranked(card.electrode, UNDETERMINED, (reason,), None, None, None, None, card.batch, card.coating)
