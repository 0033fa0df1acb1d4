"""Fast, then slow: two kinds of site, one fouling faster than the other (biexponential decay of what is left)."""

from __future__ import annotations

import numpy as np

from electrolog.fouling.shapes.shape import LOG_RATE, LOG_RATE_SD, Floats, Loss, Prior


class FastThenSlow:
    name = "fast-then-slow"
    formula = "loss = -log(p exp(-c k E) + (1 - p) exp(-k E)), p the fast part, c > 1 times as fast"
    latents: tuple[Prior, ...] = (LOG_RATE, Prior("logit of the fast part", -0.8, 0.8))
    latent_sds: tuple[Prior, ...] = (
        LOG_RATE_SD,
        Prior("log sd of the logit of the fast part between units", float(np.log(0.3)), 0.7),
    )
    parameters: tuple[Prior, ...] = (Prior("log of how many times as fast, less one", 2.5, 0.7),)

    def loss(self, hours: Floats, latents: Floats, parameters: Floats) -> Loss:
        part, beyond = 1.0 / (1.0 + np.exp(-latents[..., 1])), np.exp(parameters[..., 0])
        rate = np.exp(latents[..., 0])
        used = rate * hours
        quickly = np.exp(-beyond * used)  # the fast sites over the slow ones
        left = part * quickly + (1.0 - part)
        per_used = 1.0 + part * quickly * beyond / left
        in_times = part * quickly * beyond * used / left
        return Loss(used - np.log(left), rate * per_used, (in_times,))

    def half_life_hours(self, latents: Floats, parameters: Floats) -> Floats:
        """By bisection on log k E: the loss rises steadily and has no inverse in closed form."""
        shape = np.broadcast_shapes(latents.shape[:-1], parameters.shape[:-1])
        low, high = np.full(shape, -20.0), np.full(shape, 5.0)
        unit_rate = np.stack([np.zeros(shape), np.broadcast_to(latents[..., 1], shape)], axis=-1)
        for _ in range(50):
            middle = 0.5 * (low + high)
            below = self.loss(np.exp(middle), unit_rate, parameters).value < np.log(2.0)
            low, high = np.where(below, middle, low), np.where(below, high, middle)
        return np.asarray(np.exp(0.5 * (low + high) - latents[..., 0]))
