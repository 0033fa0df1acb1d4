"""Which word lists a lab keeps. Apart from the sheets: the shell's completion asks for it at each tab."""

from __future__ import annotations

WORD_KINDS = (
    "fibre",
    "insulation",
    "seal",
    "coating material",
    "coating method",
    "medium",
    "setting",
    "cleaning method",
    "retirement reason",
)
