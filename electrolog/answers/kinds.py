"""By what probes can be compared."""

from enum import StrEnum


class By(StrEnum):
    COATING = "coating"
    FIBRE = "fibre"
    MAKER = "maker"
    BATCH = "batch"
    WAVEFORM = "waveform"
    CLEANING = "cleaning"
    CURE = "cure"
