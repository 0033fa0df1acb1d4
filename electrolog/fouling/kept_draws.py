"""A posterior's draws, thinned and laid out as plain arrays: to be kept, and asked again without another forecast.

Everything is single precision, 1e-7 of a log sensitivity, and has the units on its first axis.
"""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any, cast

import numpy as np
from numpy.typing import NDArray

from electrolog.fouling.draws import Floats, Posterior, Strand
from electrolog.fouling.events import Events
from electrolog.fouling.fit import CohortFit
from electrolog.fouling.forecast import known_scales

Arrays = dict[str, NDArray[np.float32]]
Integers = NDArray[np.int64]


def packed(drawn: Posterior, most: int) -> Arrays:
    """About `most` draws of every unit as it is now: hours on the clock, latents, and level with damage and area."""
    arrays: Arrays = {}
    for place, (strand, picks) in enumerate(zip(drawn.strands, _picks(drawn, most), strict=True)):
        level = strand.level + strand.damage + drawn.log_area_at_end[:, None, None]
        arrays[f"hours {place}"] = np.ascontiguousarray(strand.hours_at_end.T, dtype=np.float32)
        arrays[f"latents {place}"] = np.ascontiguousarray(strand.latents[:, :, picks], dtype=np.float32)
        arrays[f"level {place}"] = np.ascontiguousarray(level[:, :, picks], dtype=np.float32)
    return arrays


def thinned(drawn: Posterior, values: Floats, most: int) -> NDArray[np.float32]:
    """(U, D) values of all draws -> those of the draws that `packed` keeps, in the same order."""
    start, kept = 0, []
    for strand, picks in zip(drawn.strands, _picks(drawn, most), strict=True):
        thetas, each = strand.level.shape[1:]
        kept.append((start + np.arange(thetas)[:, None] * each + picks).ravel())
        start += thetas * each
    return values[:, np.concatenate(kept)].astype(np.float32)


def _picks(drawn: Posterior, most: int) -> list[Integers]:
    """Which of the draws under each draw of hyper-parameters: they stand in order, so the middles of equal parts."""
    total = sum(strand.level.shape[1] * strand.level.shape[2] for strand in drawn.strands)
    found = []
    for strand in drawn.strands:
        each = strand.level.shape[2]
        kept = min(each, max(1, round(each * most / max(total, 1))))
        found.append(((np.arange(kept) + 0.5) * each / kept).astype(np.int64))
    return found


def unpacked(fit: CohortFit, arrays: Mapping[str, NDArray[np.float32]], settings: tuple[str, ...]) -> Posterior:
    """Draws to be asked for the log sensitivity after hours in these settings, and for nothing else."""
    none, whole = np.zeros(0), np.zeros(0, dtype=np.int64)
    nothing = Events(whole, np.zeros(0, dtype=np.int8), whole, none, none, (), settings, (), (), {})
    strands = []
    for place, part in enumerate(fit.components):
        scales = known_scales(part, nothing, place)
        # Any: single precision does as well for what is asked of them here
        hours, latents, level = (cast(Any, arrays[f"{name} {place}"]) for name in ("hours", "latents", "level"))
        without = np.zeros((1, 1, 1))
        strands.append(
            Strand(
                part, scales.shape, scales.weight, hours.T, none[:, None], latents, level, without, without.astype(int)
            )
        )
    units = len(arrays["hours 0"])
    flat, counts = np.zeros(units), np.zeros(units, dtype=np.int64)
    return Posterior(tuple(strands), counts, counts, flat, none, none, flat)
