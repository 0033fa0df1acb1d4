"""A recording's currents as concentrations: the sensitivity along the run, smoothed between its calibrations.

The posterior of the probe's whole life, later calibrations too, is read at every moment of the run: where a calibration
follows, the way from one to the other follows the shape of loss, not a straight average.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from electrolog.fouling.clock import log_area_changes, run_clock
from electrolog.fouling.draws import Posterior, Strand, joined, loss_at
from electrolog.fouling.events import READING, Events
from electrolog.fouling.forecast import known_scales
from electrolog.fouling.points import even_points

Floats = NDArray[np.float64]
Integers = NDArray[np.int64]
BAND = (0.05, 0.5, 0.95)
NODES = 33  # currents per moment at which quantiles are taken: between them they are all but straight lines
GOLDEN = 0.6180339887498949


def log_sensitivity_along(drawn: Posterior, moments: Events, passed: Floats) -> Floats:
    """(T, D) true log sensitivity (log nA/µM) of the one unit that was drawn, at T moments of its life.

    moments: its life cut off at each moment, as T units. passed (T,): of the exposure between the reading before and
    the reading after each moment, the share that lies before it; sudden damage falls anywhere in it alike.
    """
    counts = np.bincount(moments.unit[moments.kind == READING], minlength=len(moments.units))
    parts = [_of_strand(place, strand, moments, counts, passed) for place, strand in enumerate(drawn.strands)]
    return joined(parts) + log_area_changes(moments)[1][:, None]


def _of_strand(place: int, strand: Strand, moments: Events, counts: Integers, passed: Floats) -> Floats:
    """(T, K, S)"""
    scales = known_scales((strand.component,), moments, place)
    hours = run_clock(moments, scales.weight, scales.recovery).at_end.T
    shape = (len(counts), *strand.level.shape[1:])
    alike = Strand(
        strand.component,
        strand.shape_parameters,
        strand.weight,
        strand.hours_at_end,
        strand.hours_at_readings,
        np.broadcast_to(strand.latents, (*shape, strand.latents.shape[-1])),
        np.broadcast_to(strand.level, shape),
        strand.damage,
        strand.damaged_from,
    )
    return alike.level + strand.damage * _damaged(strand, counts, passed) - loss_at(alike, hours[:, :, None])


def _damaged(strand: Strand, counts: Integers, passed: Floats) -> NDArray[np.bool_]:
    """(T, K, S) whether the damage, if any, had happened by then."""
    draws = strand.damaged_from.shape[1:]
    happens = ((np.arange(draws[0] * draws[1]) + 0.5) * GOLDEN % 1.0).reshape(draws)
    before = strand.damaged_from < counts[:, None, None]
    meanwhile = (strand.damaged_from == counts[:, None, None]) & (happens <= passed[:, None, None])
    return np.asarray(before | meanwhile)


@dataclass(frozen=True)
class Curve:
    """current = offset + s·c / (1 + K·c): K = 0 is the straight line. Fouling scales s and leaves K.

    `noise_na`: standard deviation of one sample about its true current.
    """

    offset_na: float
    offset_se_na: float
    noise_na: float
    affinity_per_um: float = 0.0

    def concentration_um(self, signal_na: Floats, sensitivity_na_um: Floats) -> Floats:
        """Of a current above the offset; inf where the curve never reaches it."""
        straight = signal_na / sensitivity_na_um
        left = 1.0 - self.affinity_per_um * straight
        with np.errstate(divide="ignore", invalid="ignore"):
            return np.where(left > 0.0, straight / left, np.inf)


def band(current_na: Floats, moment: Integers, log_sensitivity: Floats, curve: Curve) -> Floats:
    """(3, N) 5, 50 and 95 % quantiles of the concentration (µM) behind each sample.

    current_na (N,), NaN where unknown; moment (N,): which row of log_sensitivity (T, D) holds for it. Not finite:
    the current is unknown, or lies where the curve is flat.
    """
    found = np.full((3, len(current_na)), np.nan)
    offset_na = _offsets(curve, log_sensitivity.shape[1])
    order = np.argsort(moment, kind="stable")
    edges = np.searchsorted(moment[order], np.arange(len(log_sensitivity) + 1))
    for t, log_s in enumerate(log_sensitivity):
        own = order[edges[t] : edges[t + 1]]
        own = own[np.isfinite(current_na[own])]
        if len(own):
            found[:, own] = _quantiles(current_na[own], np.exp(log_s), offset_na, curve)
    return found


def _offsets(curve: Curve, count: int) -> Floats:
    """(D,) draws of what is to be taken from a current: the curve's offset and the sample's own noise."""
    from scipy.special import ndtri

    z = ndtri(even_points(count, 2))
    return np.asarray(curve.offset_na + curve.offset_se_na * z[:, 0] + curve.noise_na * z[:, 1])


def _quantiles(current_na: Floats, sensitivity_na_um: Floats, offset_na: Floats, curve: Curve) -> Floats:
    nodes, back = np.unique(current_na, return_inverse=True)
    many = len(nodes) > NODES
    nodes = _nodes(nodes, offset_na) if many else nodes
    drawn = curve.concentration_um(nodes[:, None] - offset_na, sensitivity_na_um)
    # Quantiles that are draws themselves: between a number and infinity there is no middle.
    at_nodes = np.quantile(drawn, BAND, axis=1, method="inverted_cdf")
    return np.stack([np.interp(current_na, nodes, row) for row in at_nodes]) if many else at_nodes[:, back]


def _nodes(current_na: Floats, offset_na: Floats) -> Floats:
    """Dense about the offset: there the quantiles bend, from the noise's to the sensitivity's own. (n,) rising."""
    centre = float(offset_na.mean())
    scale = max(float(offset_na.std()), 1e-3 * float(current_na[-1] - current_na[0]))
    ends = np.arcsinh((current_na[[0, -1]] - centre) / scale)
    return np.asarray(centre + scale * np.sinh(np.linspace(ends[0], ends[1], NODES)))
