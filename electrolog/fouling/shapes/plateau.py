"""Exponential loss to a plateau: a fraction f of the sensitivity cannot foul (adsorption that saturates, Langmuir
kinetics)."""

from __future__ import annotations

import numpy as np

from electrolog.fouling.shapes.shape import LOG_RATE, LOG_RATE_SD, Floats, Loss, Prior


class Plateau:
    name = "plateau"
    formula = "loss = -log(f + (1 - f) exp(-k E)), f the fraction that stays"
    latents: tuple[Prior, ...] = (LOG_RATE,)
    latent_sds: tuple[Prior, ...] = (LOG_RATE_SD,)
    parameters: tuple[Prior, ...] = (Prior("logit of the fraction that stays", 0.0, 1.2),)

    def loss(self, hours: Floats, latents: Floats, parameters: Floats) -> Loss:
        stays = 1.0 / (1.0 + np.exp(-parameters[..., 0]))
        rate = np.exp(latents[..., 0])
        gone = -np.expm1(-rate * hours)
        left = 1.0 - (1.0 - stays) * gone
        per_hour = (1.0 - stays) * (1.0 - gone) * rate / left
        return Loss(-np.log(left), per_hour, (-gone * stays * (1.0 - stays) / left,))

    def half_life_hours(self, latents: Floats, parameters: Floats) -> Floats:
        stays = 1.0 / (1.0 + np.exp(-parameters[..., 0]))
        reaches = np.clip((0.5 - stays) / (1.0 - stays), 1e-300, None)
        return np.where(stays < 0.5, -np.log(reaches) * np.exp(-latents[..., 0]), np.inf)
