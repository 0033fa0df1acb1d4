"""The oxidation and the reduction peak of a background-subtracted voltammogram."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from electrolog.measure.sweep import nearest, rising

Array = NDArray[np.float64]

SMOOTHED_SHARE = 0.02  # of a scan: a peak is several times as wide
CLEAR_OF_NOISE = 5.0
CLEAR_SHARE = 0.05  # of the voltammogram's whole range
FROM_TURN_SHARE = 0.01  # at a turn of the sweep the background never subtracts cleanly


@dataclass(frozen=True)
class Peak:
    """`width_v`: at half its height. `by_hand`: at the potential a person named, peak or not."""

    index: int
    potential_v: float
    current_na: float
    width_v: float | None
    by_hand: bool = False


@dataclass(frozen=True)
class Peaks:
    oxidation: Peak | None
    reduction: Peak | None

    @property
    def separation_v(self) -> float | None:
        if self.oxidation is None or self.reduction is None:
            return None
        return self.oxidation.potential_v - self.reduction.potential_v


def find_peaks(
    potential_v: Array,
    current_na: Array,
    noise_na: float = 0.0,
    *,
    oxidation_v: float | None = None,
    reduction_v: float | None = None,
) -> Peaks:
    """The highest peak where the sweep rises, the lowest where it falls; None where none is clear of the noise.

    potential_v, current_na (n,). oxidation_v, reduction_v: named by a person, taken as they are.
    """
    smooth = smoothed(current_na)
    return peaks_of(potential_v, smooth, noise_na, oxidation_v=oxidation_v, reduction_v=reduction_v)


def peaks_of(
    potential_v: Array, smooth_na: Array, noise_na: float, *, oxidation_v: float | None, reduction_v: float | None
) -> Peaks:
    """The same of a voltammogram that is smoothed already."""
    upwards = rising(potential_v)
    return Peaks(
        oxidation=_peak(potential_v, smooth_na, upwards, noise_na, oxidation_v, upright=True),
        reduction=_peak(potential_v, smooth_na, ~upwards, noise_na, reduction_v, upright=False),
    )


def smoothed(current_na: Array) -> Array:
    """Savitzky–Golay, second degree: a peak keeps its height and its place. One scan (n,), or many (m, n)."""
    from scipy.signal import savgol_filter

    points = current_na.shape[-1]
    window = max(5, int(SMOOTHED_SHARE * points) // 2 * 2 + 1)
    return np.asarray(savgol_filter(current_na, min(window, points // 2 * 2 - 1), 2))


def _peak(
    potential: Array, current: Array, part: NDArray[np.bool_], noise: float, named_v: float | None, *, upright: bool
) -> Peak | None:
    if named_v is not None:
        index = nearest(potential, named_v, upwards=upright)
        return Peak(index, float(potential[index]), float(current[index]), None, by_hand=True)
    from scipy.signal import find_peaks as all_peaks

    side = current if upright else -current
    clear = max(CLEAR_OF_NOISE * noise, CLEAR_SHARE * float(np.ptp(current)))
    places, facts = all_peaks(side, height=clear, prominence=clear, width=1, rel_height=0.5)
    allowed = part & ~_near_turn(potential)
    kept = [at for at, place in enumerate(places) if allowed[place]]
    if not kept:
        return None
    best = max(kept, key=lambda at: float(facts["peak_heights"][at]))
    index = int(places[best])
    width = float(facts["widths"][best]) * float(np.median(np.abs(np.diff(potential))))
    return Peak(index, float(potential[index]), float(current[index]), width)


def _near_turn(potential: Array) -> NDArray[np.bool_]:
    turns = np.flatnonzero(np.diff(np.sign(np.diff(potential))) != 0) + 1
    near = np.zeros(len(potential), dtype=bool)
    reach = max(1, int(FROM_TURN_SHARE * len(potential)))
    for turn in (0, *turns.tolist(), len(potential) - 1):
        near[max(0, turn - reach) : turn + reach + 1] = True
    return near
