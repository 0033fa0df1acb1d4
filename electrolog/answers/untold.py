"""What a cohort's record can't tell, in words: said instead of a number that would only repeat what was assumed."""

from __future__ import annotations

from collections import Counter

import numpy as np

from electrolog.answers.cohorts import REFERENCE_SETTING, Cohort
from electrolog.fouling.events import EXPOSURE, READING, Events
from electrolog.fouling.fit import CohortFit

HARDLY_MOVED = 0.8  # posterior sd over prior sd from which the record has said hardly anything
FEW_PROBES = 3
CONTENDS = 0.05  # weight from which a shape is still in the running


def untold(fit: CohortFit, cohort: Cohort) -> list[str]:
    return [
        *_loss(cohort.events),
        *_shape(fit),
        *_priors(fit),
        *_days(cohort.events),
        *_coatings(cohort),
    ]


def _loss(events: Events) -> list[str]:
    again = _readings_after_exposure(events)
    if again == 0:
        return ["no probe was calibrated again after an exposure: how fast they foul is the prior's word alone"]
    if again < 2 * FEW_PROBES:
        return [f"only {again} calibrations follow an exposure and an earlier calibration: the loss rests on these"]
    return []


def _readings_after_exposure(events: Events) -> int:
    count, unit, calibrated, exposed = 0, -1, False, False
    for own, kind in zip(events.unit.tolist(), events.kind.tolist(), strict=True):
        if own != unit:
            unit, calibrated, exposed = own, False, False
        if kind == READING:
            count += calibrated and exposed
            calibrated = True
        exposed |= kind == EXPOSURE and calibrated
    return count


def _shape(fit: CohortFit) -> list[str]:
    contenders = [name for name, weight in sorted(fit.shape_weights.items(), key=lambda i: -i[1]) if weight >= CONTENDS]
    if len(contenders) < 2:
        return []
    return [f"the shape of loss can't be told yet: {', '.join(contenders)} remain, and a forecast averages over them"]


def _priors(fit: CohortFit) -> list[str]:
    """Settings and renewals whose number is little more than what was assumed before any data."""
    part = max(fit.components, key=lambda one: one.weight)
    layout, sd = part.layout, np.sqrt(np.diag(part.theta_covariance))
    unmoved = [own >= HARDLY_MOVED * prior.sd for own, prior in zip(sd, layout.priors, strict=True)]
    settings = [n for n, flat in zip(layout.free_settings, unmoved[layout.weight_slots], strict=True) if flat]
    renewals = [n for n, flat in zip(layout.renewals, unmoved[layout.recovery_slots], strict=True) if flat]
    said = [f"how fast {name} fouls beside {REFERENCE_SETTING} is hardly more than assumed" for name in settings]
    return said + [f"what {name.removeprefix('clean:')} gives back is hardly more than assumed" for name in renewals]


def _days(events: Events) -> list[str]:
    read = events.kind == READING
    seen = Counter(day for day, _ in set(zip(events.which[read].tolist(), events.unit[read].tolist(), strict=True)))
    alone = sum(count == 1 for count in seen.values())
    if not alone:
        return []
    said = f"{alone} of {len(seen)} calibration days saw one probe alone"
    return [f"{said}: there a wrong standard can't be told from the probe; measure two or more with each standard"]


def _coatings(cohort: Cohort) -> list[str]:
    probes = Counter(cohort.events.groups["coating"])
    few = [f"{name} ({count})" for name, count in sorted(probes.items()) if count < FEW_PROBES]
    return [f"too few probes to tell their coating from the rest: {', '.join(few)}"] if few and len(probes) > 1 else []
