"""The electroactive area of a probe, and its sensitivity per area and per exposed length."""

from __future__ import annotations

import math
from dataclasses import dataclass

from electrolog.errors import InputError


def cylinder_area_um2(diameter_um: float, exposed_length_um: float) -> float:
    """The wall and the flat tip: π·d·L + π·d²/4."""
    _positive(diameter_um=diameter_um, exposed_length_um=exposed_length_um)
    return math.pi * diameter_um * exposed_length_um + disk_area_um2(diameter_um)


def disk_area_um2(diameter_um: float) -> float:
    _positive(diameter_um=diameter_um)
    return math.pi * diameter_um**2 / 4


def area_um2(geometry: str | None, diameter_um: float | None, exposed_length_um: float | None) -> float | None:
    """None where the geometry is another one, or a length it needs is unknown."""
    if geometry == "disk" and diameter_um is not None:
        return disk_area_um2(diameter_um)
    if geometry == "cylinder" and diameter_um is not None and exposed_length_um is not None:
        return cylinder_area_um2(diameter_um, exposed_length_um)
    return None


@dataclass(frozen=True)
class Specific:
    """A sensitivity divided by a size of the probe, with its standard error (None: unknown)."""

    value: float
    se: float | None
    unit: str


def per_area(sensitivity_na_um: float, sensitivity_se_na_um: float | None, area_um2: float) -> Specific:
    """In pA/(µM·µm²). The error is that of the sensitivity alone: the lengths are taken as measured."""
    _positive(area_um2=area_um2)
    return _divided(sensitivity_na_um, sensitivity_se_na_um, area_um2, "pA/(µM·µm²)")


def per_length(sensitivity_na_um: float, sensitivity_se_na_um: float | None, exposed_length_um: float) -> Specific:
    """In pA/(µM·µm) of exposed length."""
    _positive(exposed_length_um=exposed_length_um)
    return _divided(sensitivity_na_um, sensitivity_se_na_um, exposed_length_um, "pA/(µM·µm)")


def _divided(value_na_um: float, se_na_um: float | None, size: float, unit: str) -> Specific:
    pa_per_na = 1000
    se = None if se_na_um is None else pa_per_na * se_na_um / size
    return Specific(pa_per_na * value_na_um / size, se, unit)


def _positive(**sizes: float) -> None:
    for name, size in sizes.items():
        if not (math.isfinite(size) and size > 0):
            raise InputError(f"{name} is {size}; a size above zero is needed")
