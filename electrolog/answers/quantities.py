"""What a control chart can be of."""

from enum import StrEnum


class Quantity(StrEnum):
    SENSITIVITY = "sensitivity"
    NOISE = "noise"
    BACKGROUND = "background"
    OXIDATION = "oxidation-peak"
    REDUCTION = "reduction-peak"
