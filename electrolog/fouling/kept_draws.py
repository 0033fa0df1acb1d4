"""A posterior's draws, thinned and laid out as plain arrays: to be kept, and asked again without another forecast.

Everything is single precision, 1e-7 of a log sensitivity, and has the units on its first axis.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import Any, cast

import numpy as np
from numpy.typing import NDArray

from electrolog.fouling.draws import Floats, Posterior, Strand
from electrolog.fouling.events import Events
from electrolog.fouling.fit import CohortFit, Component
from electrolog.fouling.forecast import known_scales, per_theta

Arrays = dict[str, NDArray[np.float32]]
Integers = NDArray[np.int64]


def packed(drawn: Posterior, most: int) -> Arrays:
    """About `most` draws of every unit as it is now: hours on the clock, latents, and level with damage and area."""
    arrays: Arrays = {}
    for place, (strand, picks) in enumerate(
        zip(drawn.strands, _picks([one.component for one in drawn.strands], most), strict=True)
    ):
        units, thetas, each = strand.level.shape
        flat = (units, thetas * each)
        level = strand.level + strand.damage + drawn.log_area_at_end[:, None, None]
        latents = strand.latents.reshape(*flat, strand.latents.shape[-1])
        arrays[f"hours {place}"] = strand.hours_at_end.T[:, picks // each].astype(np.float32)
        arrays[f"latents {place}"] = latents[:, picks].astype(np.float32)
        arrays[f"level {place}"] = level.reshape(flat)[:, picks].astype(np.float32)
    return arrays


def thinned(drawn: Posterior, values: Floats, most: int) -> NDArray[np.float32]:
    """(U, D) values of all draws -> those of the draws that `packed` keeps, in the same order."""
    counts = [strand.level.shape[1] * strand.level.shape[2] for strand in drawn.strands]
    starts = np.cumsum(counts) - counts
    picks = _picks([strand.component for strand in drawn.strands], most)
    kept = np.concatenate([start + chosen for start, chosen in zip(starts, picks, strict=True)])
    return values[:, kept].astype(np.float32)


def _picks(parts: Sequence[Component], most: int) -> list[Integers]:
    """Per component, which of its draws: evenly spaced, because they stand in order, and as many as its share."""
    counts = [len(part.theta_draws) * per_theta(part) for part in parts]
    found = []
    for count in counts:
        kept = min(count, round(count * most / sum(counts)))
        found.append(((np.arange(kept) + 0.5) * count / max(kept, 1)).astype(np.int64))
    return found


def unpacked(
    fit: CohortFit, arrays: Mapping[str, NDArray[np.float32]], settings: tuple[str, ...], most: int
) -> Posterior:
    """Draws, packed with the same `most`, to be asked for the log sensitivity after hours in these settings alone."""
    none, whole = np.zeros(0), np.zeros(0, dtype=np.int64)
    nothing = Events(whole, np.zeros(0, dtype=np.int8), whole, none, none, (), settings, (), (), {})
    strands = []
    for place, (part, picks) in enumerate(zip(fit.components, _picks(fit.components, most), strict=True)):
        scales, theta = known_scales((part,), nothing, place), picks // per_theta(part)
        # Any: single precision does as well for what is asked of them here
        hours, latents, level = (cast(Any, arrays[f"{name} {place}"]) for name in ("hours", "latents", "level"))
        without = np.zeros((1, 1, 1))
        drawn = (latents[:, :, None], level[:, :, None], without, without.astype(np.int64))
        strands.append(Strand(part, scales.shape[theta], scales.weight[theta], hours.T, none[:, None], *drawn))
    units = len(arrays["hours 0"])
    flat, counts = np.zeros(units), np.zeros(units, dtype=np.int64)
    return Posterior(tuple(strands), counts, counts, flat, none, none, flat)
