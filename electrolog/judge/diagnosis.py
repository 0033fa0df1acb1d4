"""Why did this probe's sensitivity change? The evidence for and against each cause, with its numbers.

Each clue is weighed by how much better it fits a cause that is there than one that isn't, as a log likelihood ratio
(I. J. Good's weight of evidence, in nats), cut at CAP so that one wild reading can't outweigh all the others. What a
cause does to a clue, and by how much, is common practice, from memory; the spreads below say how loosely it is meant.
Several causes can hold at once, so each is weighed by itself, and "not enough to tell" is an answer.
"""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass

from electrolog.units import shown_number

LIKELY, POSSIBLE, UNTOLD, UNLIKELY = "likely", "possible", "not enough to tell", "unlikely"
CAP = 2.5
LIKELY_FROM, POSSIBLE_FROM = 2.0, 0.7


@dataclass(frozen=True)
class Symptoms:
    """The last calibration against the one before it (or against the reference). None: not measured.

    Every `log_` is the natural log of a ratio, after over before. log_change: of the sensitivity, with the standard
    deviation of its measurement; expected_log_change: what the forecast made of the exposure in between, from what
    was known before. others_log_surprise: mean of observed minus expected for the other probes that were measured with
    the same standard on that day. peak shifts: after minus before. interferent: a drop of selectivity is negative.
    """

    log_change: float
    log_change_sd: float
    exposure_h: float | None = None
    expected_log_change: float | None = None
    expected_sd: float | None = None
    others_log_surprise: float | None = None
    others_sd: float | None = None
    others_count: int = 0
    oxidation_shift_v: float | None = None
    reduction_shift_v: float | None = None
    log_background: float | None = None
    log_exposed_length: float | None = None
    log_noise: float | None = None
    seal_ok: bool | None = None
    coated: bool | None = None
    log_selectivity: float | None = None

    @property
    def log_surprise(self) -> float:
        return self.log_change - (self.expected_log_change or 0.0)

    @property
    def surprise_sd(self) -> float:
        return math.hypot(self.log_change_sd, self.expected_sd or 0.0)


@dataclass(frozen=True)
class Clue:
    """weight: in nats, above zero for the cause."""

    text: str
    weight: float


@dataclass(frozen=True)
class Finding:
    cause: str
    judgement: str
    weight: float
    evidence_for: tuple[str, ...]
    evidence_against: tuple[str, ...]
    next_step: str


@dataclass(frozen=True)
class Diagnosis:
    """findings: every cause, the likeliest first. said: the answer in one sentence."""

    said: str
    findings: tuple[Finding, ...]


def diagnose(symptoms: Symptoms) -> Diagnosis:
    findings = sorted((_finding(cause, symptoms) for cause in CAUSES), key=lambda finding: -finding.weight)
    return Diagnosis(_said(symptoms, findings), tuple(findings))


def _said(symptoms: Symptoms, findings: list[Finding]) -> str:
    change = _percent(symptoms.log_change)
    likely = [finding.cause for finding in findings if finding.judgement == LIKELY]
    if likely:
        return f"sensitivity {change}: likely {' and '.join(likely)}"
    if abs(symptoms.log_change) < 2 * symptoms.log_change_sd:
        return f"sensitivity {change}: within what two calibrations of the same probe differ by"
    return f"sensitivity {change}: not enough to tell why"


@dataclass(frozen=True)
class Cause:
    name: str
    clues: tuple[Callable[[Symptoms], Clue | None], ...]
    next_step: str


def _finding(cause: Cause, symptoms: Symptoms) -> Finding:
    clues = [clue for weigh in cause.clues if (clue := weigh(symptoms)) is not None]
    weight = sum(clue.weight for clue in clues)
    return Finding(
        cause.name,
        _judgement(weight, clues),
        weight,
        tuple(clue.text for clue in clues if clue.weight > 0),
        tuple(clue.text for clue in clues if clue.weight <= 0),
        cause.next_step,
    )


def _judgement(weight: float, clues: list[Clue]) -> str:
    if not clues or abs(weight) < POSSIBLE_FROM:
        return UNTOLD
    if weight < 0:
        return UNLIKELY
    return LIKELY if weight >= LIKELY_FROM else POSSIBLE


def _clue(text: str, found: float, there: tuple[float, float], absent: tuple[float, float]) -> Clue:
    """Normal with (mean, sd) if the cause is there, and if it is absent."""
    weight = _log_normal(found, *there) - _log_normal(found, *absent)
    return Clue(text, max(-CAP, min(CAP, weight)))


def _log_normal(value: float, mean: float, sd: float) -> float:
    return -0.5 * ((value - mean) / sd) ** 2 - math.log(sd)


def _percent(log_ratio: float) -> str:
    return f"{math.expm1(log_ratio) * 100:+.0f} %" if log_ratio < math.log(10) else f"× {math.exp(log_ratio):.3g}"


def _as_forecast(at: Symptoms) -> Clue | None:
    """Fouling does what exposure made expect; without exposure there is nothing to expect."""
    if at.expected_log_change is None or at.expected_sd is None:
        return None
    text = f"sensitivity {_percent(at.log_change)}, where the exposure made expect {_percent(at.expected_log_change)}"
    there = (at.expected_log_change, math.hypot(at.surprise_sd, 0.05))
    return _clue(text, at.log_change, there, (0.0, math.hypot(at.log_change_sd, 0.05)))


def _exposed(at: Symptoms) -> Clue | None:
    if at.exposure_h is None or at.exposure_h > 0:
        return None
    return Clue("no exposure between the two calibrations", -CAP)


def _background_kept(at: Symptoms) -> Clue | None:
    """A film slows the analyte's way to the surface more than it shrinks the double layer."""
    if at.log_background is None or at.log_change > -2 * at.log_change_sd:
        return None
    text = f"background current {_percent(at.log_background)}, sensitivity {_percent(at.log_change)}"
    return _clue(text, at.log_background, (0.0, 0.15), (at.log_change, 0.15))


def _background_fell_alike(at: Symptoms) -> Clue | None:
    clue = _background_kept(at)
    return None if clue is None else Clue(clue.text, -clue.weight)


def _length(at: Symptoms) -> Clue | None:
    if at.log_exposed_length is None:
        return None
    text = f"exposed length {_percent(at.log_exposed_length)}, sensitivity {_percent(at.log_change)}"
    return _clue(text, at.log_exposed_length, (at.log_change, 0.15), (0.0, 0.1))


def _both_peaks(at: Symptoms) -> Clue | None:
    """A reference that drifts moves both peaks the same way."""
    if at.oxidation_shift_v is None or at.reduction_shift_v is None:
        return None
    together = (at.oxidation_shift_v + at.reduction_shift_v) / 2
    return _clue(f"both peaks together {_mv(together)}", together, (0.0, 0.12), (0.0, 0.015))


def _apart(at: Symptoms) -> Clue | None:
    """Slower electron transfer drives them apart."""
    if at.oxidation_shift_v is None or at.reduction_shift_v is None:
        return None
    apart = at.oxidation_shift_v - at.reduction_shift_v
    return _clue(f"peak separation {_mv(apart)}", apart, (0.12, 0.07), (0.0, 0.025))


def _mv(volts: float) -> str:
    return f"{volts * 1e3:+.0f} mV"


def _noise(at: Symptoms) -> Clue | None:
    if at.log_noise is None:
        return None
    text = f"noise × {shown_number(math.exp(at.log_noise), 2)}"
    return _clue(text, at.log_noise, (1.0, 0.5), (0.0, 0.3))


def _background_rose(at: Symptoms) -> Clue | None:
    """Solution behind the seal wets more carbon."""
    if at.log_background is None:
        return None
    text = f"background current {_percent(at.log_background)}"
    return _clue(text, at.log_background, (0.35, 0.25), (0.0, 0.2))


def _seal(at: Symptoms) -> Clue | None:
    if at.seal_ok is None:
        return None
    return Clue("seal sound on inspection", -1.5) if at.seal_ok else Clue("seal not sound on inspection", CAP)


def _coat(at: Symptoms) -> Clue | None:
    return Clue("the probe was never coated", -2 * CAP) if at.coated is False else None


def _selectivity(at: Symptoms) -> Clue | None:
    if at.log_selectivity is None:
        return None
    text = f"selectivity {_percent(at.log_selectivity)}"
    return _clue(text, at.log_selectivity, (-0.7, 0.4), (0.0, 0.2))


def _others(at: Symptoms) -> Clue | None:
    """A wrong standard moves every probe of its day by the same share, against what each was expected to do."""
    if at.others_log_surprise is None or at.others_sd is None:
        return None
    text = (
        f"{at.others_count} other probes of that day and standard read {_percent(at.others_log_surprise)} against "
        f"expectation, this one {_percent(at.log_surprise)}"
    )
    sd = math.hypot(at.others_sd, 0.03)
    there, absent = (at.log_surprise, math.hypot(sd, at.surprise_sd)), (0.0, sd)
    return _clue(text, at.others_log_surprise, there, absent)


def _power_of_ten(at: Symptoms) -> Clue | None:
    """A decimal moved, or nM read as µM; anything less than half a decade isn't a slip of that kind."""
    decades = at.log_surprise / math.log(10)
    nearest = min((-6, -3, -1, 1, 3, 6), key=lambda k: abs(decades - k))
    text = f"the factor is {_percent(at.log_surprise)} against expectation"
    sd = math.hypot(at.surprise_sd / math.log(10), 0.05)
    return _clue(text, decades, (float(nearest), sd), (0.0, math.hypot(sd, 0.3)))


CAUSES = (
    Cause(
        "fouling",
        (_as_forecast, _exposed, _background_kept),
        "clean by the lab's method and calibrate again: what comes back was fouling",
    ),
    Cause(
        "a drifting reference electrode",
        (_both_peaks,),
        "measure the reference against a fresh one, then calibrate against the fresh one",
    ),
    Cause(
        "slower electron transfer",
        (_apart,),
        "condition the surface with the waveform and look whether the peaks come together",
    ),
    Cause("loss of area", (_background_fell_alike, _length), "look at the tip under the microscope and measure it"),
    Cause(
        "a failing seal",
        (_noise, _background_rose, _seal),
        "inspect the seal under the microscope; watch the background in buffer for an hour",
    ),
    Cause("loss of coating", (_coat, _selectivity), "calibrate with the interferent again; if it holds, re-coat"),
    Cause("a bad standard", (_others,), "make a fresh standard and calibrate this probe and one good one with it"),
    Cause(
        "a slip of entry", (_power_of_ten,), "look the points up in the bench notes and amend the entry if it is one"
    ),
)
