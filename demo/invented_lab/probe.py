"""One probe as it truly is, which the lab never sees."""

from __future__ import annotations

import math
import random
from collections.abc import Iterator
from dataclasses import dataclass
from datetime import date
from itertools import count
from typing import Any

from .truth import TRUTH, dice


@dataclass
class Probe:
    label: str
    batch: str
    made_on: date
    waveform: str
    coating: str
    diameter_um: float
    exposed_length_um: float
    level_na_um_per_1000_um2: float
    rate_per_h: float
    noise_na: float
    exposure_h: float = 0.0  # weighted, and set back by what renews

    @property
    def analyte(self) -> str:
        return str(TRUTH["use"][self.waveform]["analyte"])

    @property
    def area_um2(self) -> float:
        return math.pi * self.diameter_um * self.exposed_length_um

    @property
    def log_loss(self) -> float:
        return float((self.rate_per_h * self.exposure_h) ** TRUTH["fouling"]["stretch"])

    @property
    def sensitivity_na_um(self) -> float:
        return self.level_na_um_per_1000_um2 * self.area_um2 / 1000 * math.exp(-self.log_loss)

    def expose(self, hours: float, setting: str) -> None:
        self.exposure_h += hours * TRUTH["setting_weight"][setting]

    def renew(self, method: str) -> None:
        left = self.log_loss * (1 - TRUTH["renewal"][method])
        self.exposure_h = left ** (1 / TRUTH["fouling"]["stretch"]) / self.rate_per_h


def made_probes(seed: int) -> Iterator[Probe]:
    turns = {waveform: count() for waveform in TRUTH["use"]}
    order = TRUTH["coating_turns"]["order"]
    for batch in TRUTH["batch"]:
        of_batch = dice(seed, batch["batch"])
        level = of_batch.gauss(0, TRUTH["level"]["batch_sd"])
        rate = of_batch.gauss(0, TRUTH["fouling"]["batch_rate_sd"])
        waveforms = [waveform for waveform, n in batch["uses"].items() for _ in range(n)]
        for number, waveform in enumerate(waveforms, start=1):
            coating = order[next(turns[waveform]) % len(order)]
            label = f"{batch['batch']}-{number:02d}"
            yield _made(label, batch, waveform, coating, level, rate, dice(seed, f"{label}/made"))


def _made(
    label: str,
    batch: dict[str, Any],
    waveform: str,
    coating: str,
    log_level_of_batch: float,
    log_rate_of_batch: float,
    rng: random.Random,
) -> Probe:
    use, coat = TRUTH["use"][waveform], TRUTH["coating"][coating]
    log_level = log_level_of_batch + rng.gauss(0, TRUTH["level"]["probe_sd"])
    log_rate = log_rate_of_batch + rng.gauss(0, TRUTH["fouling"]["probe_rate_sd"])
    return Probe(
        label=label,
        batch=batch["batch"],
        made_on=batch["made_on"],
        waveform=waveform,
        coating=coating,
        diameter_um=batch["fibre_diameter_um"],
        exposed_length_um=round(rng.gauss(batch["exposed_length_um"], TRUTH["life"]["exposed_length_sd_um"])),
        level_na_um_per_1000_um2=use["level_na_um_per_1000_um2"] * coat["level_factor"] * math.exp(log_level),
        rate_per_h=use["rate_per_h"] * coat["rate_factor"] * math.exp(log_rate),
        noise_na=rng.uniform(*TRUTH["reading"]["noise_na"]),
    )
