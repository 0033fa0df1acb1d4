"""What a fit can't tell, in words: a number that rests on a starting assumption is said to."""

from __future__ import annotations

import numpy as np

from electrolog.fouling.events import EXPOSURE, READING, Events
from electrolog.fouling.fit import Component
from electrolog.fouling.parameters import IN_VIVO
from electrolog.units import shown_percent

FEW_PAIRS = 8
HARDLY_LEARNED = 0.8  # of a prior's sd still left


def notes_on(
    events: Events, parts: tuple[Component, ...], shape_weights: dict[str, float], unsettled: tuple[str, ...]
) -> tuple[str, ...]:
    return (
        *on_readings(events),
        *on_shapes(shape_weights),
        *on_hyper_parameters(events, parts),
        *on_convergence(unsettled),
    )


def on_readings(events: Events) -> list[str]:
    read = events.kind == READING
    if not read.any():
        return ["no calibration yet: every number rests on the starting assumptions alone"]
    notes = []
    pairs = count_informative(events)
    if pairs == 0:
        notes.append(
            "no probe has calibrations with exposure between them: nothing is known yet of how fast probes foul"
        )
    elif pairs < FEW_PAIRS:
        have = "1 probe has" if pairs == 1 else f"{pairs} probes have"
        notes.append(
            f"only {have} calibrations with exposure between them: rates rest mostly on the starting assumptions"
        )
    if len(np.unique(events.which[read])) == 1:
        notes.append("all calibrations are of one day: that day's error can't be told from the probes' own sensitivity")
    if not np.isfinite(events.se[read]).any():
        notes.append("no calibration gives its line's own error: it is counted in the residual")
    return notes


def count_informative(events: Events) -> int:
    """Units with exposure between two of their readings."""
    exposures = np.cumsum(events.kind == EXPOSURE)
    read = events.kind == READING
    unit, before = events.unit[read], exposures[read]
    moved = (unit[1:] == unit[:-1]) & (before[1:] > before[:-1])
    return len(np.unique(unit[1:][moved]))


def on_shapes(shape_weights: dict[str, float]) -> list[str]:
    likely = sorted((name for name, weight in shape_weights.items() if weight >= 0.1), key=lambda n: -shape_weights[n])
    if len(likely) < 2 or max(shape_weights.values()) > 0.9:
        return []
    said = ", ".join(f"{name} ({shown_percent(shape_weights[name])})" for name in likely)
    return [f"the calibrations can't tell between shapes of loss: {said}; forecasts average over them"]


def on_hyper_parameters(events: Events, parts: tuple[Component, ...]) -> list[str]:
    main = max(parts, key=lambda part: part.weight)
    layout = main.layout
    if not layout.shape.latents:
        return []
    sd = np.sqrt(np.diag(main.theta_covariance))
    left = sd / np.array([prior.sd for prior in layout.priors])
    unknown_settings = [
        n for n, x in zip(layout.free_settings, left[layout.weight_slots], strict=True) if x > HARDLY_LEARNED
    ]
    unknown_methods = [
        n for n, x in zip(layout.renewals, left[layout.recovery_slots], strict=True) if x > HARDLY_LEARNED
    ]
    notes = [f"how fast {name} fouls beside {IN_VIVO} can't be told yet" for name in unknown_settings]
    notes += [f"how much {name} brings back can't be told yet" for name in unknown_methods]
    exposed = {events.settings[k] for k in np.unique(events.which[events.kind == EXPOSURE])}
    if exposed and IN_VIVO not in exposed:
        notes.append(
            f"no exposure was {IN_VIVO}: how fast probes foul there rests on the other settings and assumed weights"
        )
    return notes


def on_convergence(unsettled: tuple[str, ...]) -> list[str]:
    return [
        f"the fit of shape {name} did not converge: look at exposures with no calibration after them, at days with one "
        "calibration and at repeated slips; its intervals may be wrong"
        for name in unsettled
    ]
