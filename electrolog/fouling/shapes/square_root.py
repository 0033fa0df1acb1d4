"""Square root of exposure: a film that thickens by diffusion through itself (parabolic growth law)."""

from __future__ import annotations

import numpy as np

from electrolog.fouling.shapes.shape import LOG_RATE, LOG_RATE_SD, LOG_TWO, Floats, Loss, Prior


class SquareRoot:
    name = "square-root"
    formula = "loss = sqrt(k E)"
    latents: tuple[Prior, ...] = (LOG_RATE,)
    latent_sds: tuple[Prior, ...] = (LOG_RATE_SD,)
    parameters: tuple[Prior, ...] = ()

    def loss(self, hours: Floats, latents: Floats, parameters: Floats) -> Loss:
        value = np.sqrt(np.exp(latents[..., 0]) * hours)
        return Loss(value, 0.5 * value / np.maximum(hours, 1e-12), ())

    def half_life_hours(self, latents: Floats, parameters: Floats) -> Floats:
        return LOG_TWO**2 * np.exp(-latents[..., 0])
