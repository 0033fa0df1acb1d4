"""No loss: the sensitivity stays what it was."""

from __future__ import annotations

import numpy as np

from electrolog.fouling.shapes.shape import Floats, Loss, Prior


class NoLoss:
    name = "none"
    formula = "loss = 0"
    latents: tuple[Prior, ...] = ()
    latent_sds: tuple[Prior, ...] = ()
    parameters: tuple[Prior, ...] = ()

    def loss(self, hours: Floats, latents: Floats, parameters: Floats) -> Loss:
        zero = np.zeros(np.broadcast_shapes(hours.shape, latents.shape[:-1]))
        return Loss(zero, zero, ())

    def half_life_hours(self, latents: Floats, parameters: Floats) -> Floats:
        return np.full(latents.shape[:-1], np.inf)
