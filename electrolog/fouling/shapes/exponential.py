"""Exponential loss: every hour takes the same fraction of what is left (first-order loss of active sites)."""

from __future__ import annotations

import numpy as np

from electrolog.fouling.shapes.shape import LOG_RATE, LOG_RATE_SD, LOG_TWO, Floats, Loss, Prior


class Exponential:
    name = "exponential"
    formula = "loss = k E"
    latents: tuple[Prior, ...] = (LOG_RATE,)
    latent_sds: tuple[Prior, ...] = (LOG_RATE_SD,)
    parameters: tuple[Prior, ...] = ()

    def loss(self, hours: Floats, latents: Floats, parameters: Floats) -> Loss:
        rate = np.exp(latents[..., 0])
        value = rate * hours
        return Loss(value, np.broadcast_to(rate, value.shape), ())

    def half_life_hours(self, latents: Floats, parameters: Floats) -> Floats:
        return LOG_TWO * np.exp(-latents[..., 0])
