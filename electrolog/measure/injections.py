"""When each injection of a flow-cell recording began and ended: found from its edges, or given as a table."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from itertools import pairwise

import numpy as np
from numpy.typing import NDArray

from electrolog.errors import DataError, InputError
from electrolog.measure.recording import Span

Array = NDArray[np.float64]

EDGE_S = 4.0
EDGE_NOISES = 6.0  # an edge stands out from the noise by this many standard deviations
EDGE_SHARE = 0.01  # and is at least this share of the largest edge: ripples of a pump are smaller
ONSET_SHARE = 0.05
_PER_EDGE = 20


@dataclass(frozen=True)
class Found:
    """`downward`: the current falls at an injection, as where oxidation is recorded as negative."""

    injections: tuple[Span, ...]
    downward: bool
    warnings: tuple[str, ...]


def find_injections(time_s: Array, current_na: Array, edge_s: float = EDGE_S) -> Found:
    """Injections last longer than `edge_s`, over which the levels before and after each moment are compared.

    A slow drift is alike on both sides and drops out. Raises DataError where nothing stands out from the noise.
    """
    if not edge_s > 0:
        raise InputError(f"edge: {edge_s:g} s is no length; accepted: above zero and shorter than an injection")
    time, level = in_blocks(time_s, current_na, edge_s / _PER_EDGE)
    if len(time) < 4 * _PER_EDGE:
        raise DataError(
            f"the recording lasts {time_s[-1] - time_s[0]:.3g} s, too short to find edges of {edge_s:g} s",
            "give the injections as a table, or a shorter --edge",
        )
    contrast, drift = _contrast(level, _PER_EDGE)
    rises, falls = _edges(contrast, _noise_of_contrast(level))
    downward = _first_is_a_fall(rises, falls)
    begins, ends = (falls, rises) if downward else (rises, falls)
    steady = level - drift * np.arange(len(level))
    upright = -steady if downward else steady
    ends = _with_faint_ends(begins, ends, upright, -contrast if downward else contrast)
    onsets, stops = [_onset(at, upright) for at in begins], [_stop(at, upright) for at in ends]
    spans, warnings = _paired(onsets, stops, len(time) - 1)
    return Found(tuple(Span(float(time[a]), float(time[b])) for a, b in spans), downward, tuple(warnings))


def given_injections(spans: Sequence[Span], time_s: Array) -> tuple[Span, ...]:
    """A person's table, held against the clock. Raises InputError for one outside the recording, or an overlap."""
    for place, span in enumerate(spans, 1):
        if not time_s[0] <= span.start_s < span.end_s <= time_s[-1]:
            raise InputError(
                f"injection {place} runs from {span.start_s:g} s to {span.end_s:g} s; accepted: a start before its "
                f"end, both within {time_s[0]:g} to {time_s[-1]:g} s"
            )
    for place, (one, other) in enumerate(pairwise(spans), 1):
        if other.start_s < one.end_s:
            raise InputError(
                f"injections {place} and {place + 1} overlap: {other.start_s:g} s lies before {one.end_s:g} s",
                "each must end before the next begins, in the order of time",
            )
    return tuple(spans)


def in_blocks(time_s: Array, current_na: Array, block_s: float) -> tuple[Array, Array]:
    """Means over stretches of about `block_s`: the same edges, and millions of samples fewer."""
    size = max(1, round(block_s / float(np.median(np.diff(time_s)))))
    whole = len(time_s) // size * size
    return time_s[:whole].reshape(-1, size).mean(1), current_na[:whole].reshape(-1, size).mean(1)


def contrast_over(levels: Array, width: int) -> Array:
    """Mean of the `width` rows after each moment minus that of the `width` before; the ends see less of both.

    levels: (n,) or (n, k).
    """
    padded = np.concatenate([np.repeat(levels[:1], width, 0), levels, np.repeat(levels[-1:], width, 0)])
    total = np.concatenate([np.zeros_like(padded[:1]), np.cumsum(padded, axis=0)])
    means = (total[width:] - total[:-width]) / width
    return np.asarray(means[width : width + len(levels)] - means[: len(levels)])


def spread(values: Array) -> float:
    """Standard deviation from the median of the distances: the edges themselves don't count in it."""
    return float(1.4826 * np.median(np.abs(values - np.median(values))))


def _contrast(level: Array, width: int) -> tuple[Array, float]:
    """Without its median, which is the drift; and that drift per block.

    Beyond its ends the recording is mirrored in them, so that it drifts on there.
    """
    before = 2 * level[:5].mean() - level[width:0:-1]
    after = 2 * level[-5:].mean() - level[-2 : -width - 2 : -1]
    drifting = np.concatenate([before, level, after]) - level.mean()
    found = contrast_over(drifting, width)[width:-width]
    drift = float(np.median(found))
    return found - drift, drift / width


def _noise_of_contrast(level: Array) -> float:
    """From neighbours' differences: neither drift nor a slow tail counts in it."""
    return float(spread(np.diff(level)) / np.sqrt(_PER_EDGE))


def _edges(contrast: Array, noise: float) -> tuple[list[int], list[int]]:
    from scipy.signal import find_peaks

    least = max(EDGE_NOISES * noise, EDGE_SHARE * float(np.abs(contrast).max()))
    sides = (contrast, -contrast)
    found = [find_peaks(side, height=least, prominence=least, distance=_PER_EDGE)[0] for side in sides]
    if not any(places.size for places in found):
        raise DataError(
            "no injection stands out from the noise of this recording",
            "give the injections as a table, or look at the signal first",
        )
    return found[0].tolist(), found[1].tolist()


def _first_is_a_fall(rises: list[int], falls: list[int]) -> bool:
    """A recording begins at rest, so that its first edge is the beginning of an injection."""
    return min([*rises, *falls]) in falls


def _onset(steepest: int, level: Array) -> int:
    """From the steepest moment back to where the current left its rest."""
    first = max(0, steepest - 2 * _PER_EDGE)
    rest, top = float(np.median(level[first : first + _PER_EDGE])), float(level[steepest : steepest + _PER_EDGE].max())
    at = steepest
    while at > first and level[at] > rest + ONSET_SHARE * (top - rest):
        at -= 1
    return at


def _stop(steepest: int, level: Array) -> int:
    """From the steepest moment back to where the current left its plateau."""
    first = max(0, steepest - 2 * _PER_EDGE)
    top, low = float(np.median(level[first : first + _PER_EDGE])), float(level[steepest : steepest + _PER_EDGE].min())
    at = steepest
    while at > first and level[at] < top - ONSET_SHARE * (top - low):
        at -= 1
    return at


def _with_faint_ends(begins: list[int], ends: list[int], level: Array, contrast: Array) -> list[int]:
    """A slow tail may end an injection without a clear edge: where the current came down, the steepest fall is it.

    Both must be so: a fall of a third of the rise, and a level a quarter down; a drift upwards hides part of it.
    """
    found = list(ends)
    for begin, following in pairwise(begins):
        first, last = begin + _PER_EDGE, following - _PER_EDGE
        if first >= last or any(begin < end < following for end in ends):
            continue
        steepest = first + int(np.argmin(contrast[first:last]))
        rest = float(level[max(0, begin - _PER_EDGE) : max(1, begin - 5)].mean())
        top, later = float(level[begin + 5 : first + 5].mean()), float(level[last - 10 : last].mean())
        if contrast[steepest] < -contrast[begin] / 3 and later < rest + 0.75 * (top - rest):
            found.append(steepest)
    return sorted(found)


def _paired(begins: list[int], ends: list[int], last: int) -> tuple[list[tuple[int, int]], list[str]]:
    spans: list[tuple[int, int]] = []
    warnings: list[str] = []
    for place, begin in enumerate(begins):
        following = begins[place + 1] if place + 1 < len(begins) else None
        end = next((at for at in ends if at > begin), last)
        if following is not None and end > following:
            warnings.append(
                f"injections {place + 1} and {place + 2} overlap: the second begins before the current came back "
                "to rest"
            )
            end = following
        elif end == last:
            warnings.append(f"the recording ends within injection {place + 1}")
        spans.append((begin, end))
    return spans, warnings
