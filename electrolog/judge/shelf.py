"""The same verdict for a whole shelf of probes at once, best first: one run, many probes, arrays instead of a loop."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from electrolog.judge import odds, words
from electrolog.judge.decision import FIT, RECALIBRATE, RETIRE, UNDETERMINED, Decision, Situation, decide
from electrolog.judge.facts import CalibrationFacts, Reason, noise_of
from electrolog.judge.limits import Limits, contradictions
from electrolog.judge.picture import Outlook
from electrolog.judge.question import refuse_nonsense
from electrolog.judge.value import value_of_calibration

Array = NDArray[np.float64]

ROUGH_OUTCOMES = 24  # a shelf ranks; the exact chance is `judge`'s to say
_ORDER = {FIT: 0, RECALIBRATE: 1, UNDETERMINED: 2, RETIRE: 3}


@dataclass(frozen=True)
class Shelf:
    """U probes asked about the same run; the fields are those of a Question, one entry or row per probe.

    log_sensitivity_at: minutes of run -> (U, D) draws. reference_log_sensitivity: (U, D), rows of NaN where there
    is no reference.
    """

    run_min: float
    log_sensitivity_at: Callable[[float], Array]
    limits: Limits
    calibrations: Sequence[CalibrationFacts | None]
    reference_log_sensitivity: Array
    uses: Sequence[int]
    out_of_use: Sequence[str]
    reading_sd_log: float = 0.05
    needs_um: float | None = None
    assay: str = "this analyte and waveform"


@dataclass(frozen=True)
class Standing:
    """One probe's place on the shelf; `probe` is its index in the question. Medians are at the end of the run."""

    probe: int
    verdict: str
    reasons: tuple[Reason, ...]
    p_breach: float | None
    sensitivity_na_um: float
    fraction_left: float | None
    lod_um: float | None


def judge_shelf(shelf: Shelf) -> list[Standing]:
    """Every probe's standing, best first: by verdict, then by odds. Raises InputError as `judge` does."""
    refuse_nonsense(shelf)
    against = tuple(Reason("limits", text) for text in contradictions(shelf.limits))
    seen = _look(shelf)
    standings = [_standing(shelf, seen, probe, against) for probe in range(len(shelf.calibrations))]
    return sorted(standings, key=_rank)


def _rank(standing: Standing) -> tuple[int, float, float]:
    p = 2.0 if standing.p_breach is None else standing.p_breach
    return _ORDER[standing.verdict], p, -standing.sensitivity_na_um


@dataclass(frozen=True)
class _Seen:
    """Over all probes: (U,) odds and medians, (U, D) draws and what they break, the rules that can be told."""

    ends: odds.EndLimits
    log_now: Array
    log_end: Array
    broken_now: odds.Mask
    broken_end: odds.Mask
    p_now: Array
    p_end: Array
    too_wide: odds.Mask
    has_reference: odds.Mask
    has_noise: odds.Mask
    middle: Array
    share: Array
    lod_um: Array

    def untold(self, probe: int) -> tuple[str, ...]:
        told = {
            odds.SHARE: self.has_reference[probe],
            odds.LOD: self.has_noise[probe],
            odds.NEEDS: self.has_noise[probe],
        }
        return tuple(rule for rule in self.ends.by_rule if not told[rule])


def _look(shelf: Shelf) -> _Seen:
    log_now, log_end = shelf.log_sensitivity_at(0.0), shelf.log_sensitivity_at(shelf.run_min)
    reference, noise_na = shelf.reference_log_sensitivity, noise_draws(shelf.calibrations, log_now.shape[1])
    beside, ends = odds.Beside(reference, noise_na), odds.EndLimits.of(shelf.limits, shelf.needs_um)
    least = odds.least_log_sensitivity(beside, ends)
    broken_now, broken_end = (odds.below(log, least) for log in (log_now, log_end))
    widest = ends.widest_interval
    middle = np.median(log_end, axis=1)
    return _Seen(
        ends=ends,
        log_now=log_now,
        log_end=log_end,
        broken_now=broken_now,
        broken_end=broken_end,
        p_now=broken_now.mean(axis=1),
        p_end=broken_end.mean(axis=1),
        too_wide=np.zeros(len(log_end), bool) if widest is None else odds.relative_width(log_end) > widest,
        has_reference=~np.isnan(reference[:, 0]),
        has_noise=~np.isnan(noise_na[:, 0]),
        middle=np.exp(middle),
        share=np.exp(np.median(log_end - reference, axis=1)),
        lod_um=ends.signal_to_noise * np.median(noise_na, axis=1) * np.exp(-middle),
    )


def noise_draws(calibrations: Sequence[CalibrationFacts | None], draws: int) -> Array:
    """(U, D), or (U, 1) where every noise is taken as known; rows of NaN where nothing is known."""
    noises = [noise_of(facts) if facts else None for facts in calibrations]
    uncertain = any(noise and noise.degrees_of_freedom for noise in noises)
    found = np.full((len(noises), draws if uncertain else 1), np.nan)
    for probe, noise in enumerate(noises):
        if noise is not None:
            found[probe] = noise.draws(draws) if noise.degrees_of_freedom else noise.sd_na
    return found


def _standing(shelf: Shelf, seen: _Seen, probe: int, against: tuple[Reason, ...]) -> Standing:
    decision = _decision(shelf, seen, probe, against)
    return Standing(
        probe,
        decision.word,
        decision.reasons or (words.in_short(float(seen.p_end[probe])),),
        decision.p_breach,
        float(seen.middle[probe]),
        _known(seen.share[probe]),
        _known(seen.lod_um[probe]),
    )


def _decision(shelf: Shelf, seen: _Seen, probe: int, against: tuple[Reason, ...]) -> Decision:
    if shelf.out_of_use[probe]:
        return Decision(RETIRE, (Reason("state", shelf.out_of_use[probe]),))
    if against:
        return Decision(UNDETERMINED, against)
    situation = Situation(
        shelf.calibrations[probe],
        shelf.uses[probe],
        shelf.limits,
        shelf.assay,
        float(seen.p_now[probe]),
        float(seen.p_end[probe]),
        bool(seen.too_wide[probe]),
        bool(seen.ends.by_rule),
        seen.untold(probe),
        lambda: _outlook(shelf, seen, probe),
    )
    return decide(situation)


def _outlook(shelf: Shelf, seen: _Seen, probe: int) -> Outlook | None:
    risk = shelf.limits.accepted_risk()
    if risk is None:
        return None
    value = value_of_calibration(
        seen.log_now[probe],
        seen.log_end[probe],
        seen.broken_now[probe],
        seen.broken_end[probe],
        reading_sd_log=shelf.reading_sd_log,
        accepted_risk=risk.value,
        widest_interval=seen.ends.widest_interval,
        outcomes=ROUGH_OUTCOMES,
    )
    return Outlook(risk.value, None, value)


def _known(value: float) -> float | None:
    return None if np.isnan(value) else float(value)
