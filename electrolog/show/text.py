"""User text on its way to a terminal: shown as it was typed, unable to act on the terminal it is shown in."""

from __future__ import annotations

import codecs
import sys
import unicodedata
from typing import TextIO

# What an older terminal or a redirected stream can't encode is spelled out rather than lost: µ is a unit.
_SPELLED = {
    "µ": "u",
    "μ": "u",
    "−": "-",
    "–": "-",
    "±": "+-",
    "×": "x",
    "…": "...",
    "°": " deg",
    "→": "->",
    "≤": "<=",
    "≥": ">=",
    "·": "*",
    "²": "^2",
    "σ": "sd",
    "─": "-",
}
_KEPT = "\n\t"
_BIDI = {"LRE", "RLE", "PDF", "LRO", "RLO", "LRI", "RLI", "FSI", "PDI"}


def safe(text: object) -> str:
    r"""Text without control characters: an ESC is shown as \x1b, so nothing a note holds can move the cursor.

    Marks that only order letters from right to left stay; those that would reorder what follows are shown.
    """
    return "".join(_shown(sign) for sign in str(text))


def _shown(sign: str) -> str:
    if sign in _KEPT:
        return sign
    if unicodedata.category(sign) in ("Cc", "Cs") or unicodedata.bidirectional(sign) in _BIDI:
        return sign.encode("unicode_escape").decode("ascii")
    return sign


def one_line(text: object) -> str:
    return " ".join(safe(text).split())


def _spell_out(error: UnicodeError) -> tuple[str, int]:
    if not isinstance(error, UnicodeEncodeError):
        raise error
    failed = error.object[error.start : error.end]
    return "".join(_SPELLED.get(sign) or sign.encode("unicode_escape").decode("ascii") for sign in failed), error.end


def prepare_streams() -> None:
    """Makes standard output and error able to take any text, whatever encoding they were opened with."""
    codecs.register_error("electrolog", _spell_out)
    for stream in (sys.stdout, sys.stderr):
        if hasattr(stream, "reconfigure"):
            stream.reconfigure(errors="electrolog")


def width(stream: TextIO | None = None) -> int:
    """Columns to fill: the terminal's, or COLUMNS, or 100 where the output goes to a file."""
    import os
    import shutil

    stream = stream or sys.stdout
    fallback = 80 if stream.isatty() else 100
    columns = (
        shutil.get_terminal_size((fallback, 24)).columns if stream.isatty() or "COLUMNS" in os.environ else fallback
    )
    return max(40, columns)
