"""Growing patches: covered area spreads from seeds, so the loss is a power of exposure (Avrami; stretched
exponential below 1).

The exponent may differ from unit to unit: its log has a mean and a standard deviation in the cohort, like the log rate.
"""

from __future__ import annotations

import numpy as np

from electrolog.fouling.shapes.shape import LOG_RATE, LOG_RATE_SD, LOG_TWO, Floats, Loss, Prior

# Of a grid's outermost nodes, far from any posterior: keeps squares finite.
MOST_LOG_LOSS, MOST_LOG_EXPONENT = 7.0, 4.0


class GrowingPatch:
    name = "patch"
    formula = "loss = (k E)^g"
    latents: tuple[Prior, ...] = (LOG_RATE, Prior("log exponent", 0.0, 0.6))
    latent_sds: tuple[Prior, ...] = (
        LOG_RATE_SD,
        Prior("log sd of log exponent between units", float(np.log(0.15)), 0.7),
    )
    parameters: tuple[Prior, ...] = ()

    def loss(self, hours: Floats, latents: Floats, parameters: Floats) -> Loss:
        exponent = np.exp(np.minimum(latents[..., 1], MOST_LOG_EXPONENT))
        positive = np.maximum(hours, 1e-12)
        value = np.exp(np.minimum(exponent * (np.log(positive) + latents[..., 0]), MOST_LOG_LOSS))
        value = np.where(hours > 0.0, value, 0.0)
        return Loss(value, exponent * value / positive, ())

    def half_life_hours(self, latents: Floats, parameters: Floats) -> Floats:
        return np.asarray(np.exp(np.log(LOG_TWO) * np.exp(-latents[..., 1]) - latents[..., 0]))
