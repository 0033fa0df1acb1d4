"""What is left of a typical probe after hours in vivo, by each shape of loss and by all of them together."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from electrolog.fouling.fit import CohortFit, Component
from electrolog.fouling.summary import typical_latents

Floats = NDArray[np.float64]
QUANTILES = (0.05, 0.5, 0.95)


@dataclass(frozen=True)
class TypicalLoss:
    """Shares left (H,) after hours in vivo (H,) of a probe whose level and rate are its group's means.

    low, median, high: 5, 50 and 95 % over all shapes, each by its weight. by_shape: each shape's own median.
    """

    coating: str
    waveform: str
    hours: Floats
    low: Floats
    median: Floats
    high: Floats
    by_shape: dict[str, Floats]


@dataclass(frozen=True)
class _Drawn:
    """Shares left (D, H) under one component, each draw with its weight."""

    shape: str
    share: Floats
    weight: Floats


def typical_loss(fit: CohortFit, coating: str, waveform: str, hours: Floats) -> TypicalLoss:
    """A coating or waveform that the fit never saw is taken for its cohort's mean."""
    drawn = [_drawn(part, coating, waveform, hours) for part in fit.components]
    low, median, high = _quantiles(drawn)
    shapes = dict.fromkeys(one.shape for one in drawn)
    by_shape = {name: _quantiles([one for one in drawn if one.shape == name])[1] for name in shapes}
    return TypicalLoss(coating, waveform, hours, low, median, high, by_shape)


def _drawn(part: Component, coating: str, waveform: str, hours: Floats) -> _Drawn:
    latents, parameters = typical_latents(part, coating, waveform)
    loss = part.layout.shape.loss(hours[:, None, None], latents[None], parameters[None]).value
    share = np.exp(-np.broadcast_to(loss, (len(hours), *latents.shape[:-1])).reshape(len(hours), -1).T)
    return _Drawn(part.layout.shape.name, share, np.full(len(share), part.weight / len(share)))


def _quantiles(drawn: list[_Drawn]) -> Floats:
    """(3, H), weighted."""
    share, weight = np.concatenate([one.share for one in drawn]), np.concatenate([one.weight for one in drawn])
    order = np.argsort(share, axis=0)
    ranked = np.take_along_axis(share, order, axis=0)
    reached = np.cumsum(weight[order], axis=0)
    places = [(reached < q * reached[-1]).sum(axis=0).clip(max=len(share) - 1) for q in QUANTILES]
    return np.stack([np.take_along_axis(ranked, place[None], axis=0)[0] for place in places])
