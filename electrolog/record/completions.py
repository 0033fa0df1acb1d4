"""The names that a shell completes: asked of the file itself, since the usual way takes longer than a keystroke."""

from __future__ import annotations

import sqlite3
from collections.abc import Sequence
from contextlib import closing
from pathlib import Path

from electrolog.record.builtin import WORDS

LABELS = {
    "electrodes": "electrode",
    "batches": "batch",
    "standards": "standard",
    "analytes": "analyte",
    "waveforms": "waveform",
    "calibrations": "calibration",
}
MOST = 500


def names(where: str, what: str, beginning: str) -> list[str]:
    """Live labels of a sheet, or words of a list, that begin so; none where the record is no file or can't be read."""
    path = Path(where)
    builtin = list(WORDS.get(what, ()))
    found = _asked(path, what, beginning) if path.is_file() else []
    return [name for name in dict.fromkeys([*builtin, *found]) if name.casefold().startswith(beginning.casefold())]


def _asked(path: Path, what: str, beginning: str) -> Sequence[str]:
    column = LABELS.get(what)
    pattern = beginning.replace("^", "^^").replace("%", "^%").replace("_", "^_") + "%"
    if column:
        query = f"SELECT {column} FROM {what} WHERE struck IS NULL AND {column} LIKE ? ESCAPE '^' LIMIT {MOST}"  # noqa: S608
        values: tuple[str, ...] = (pattern,)
    else:
        query = f"SELECT term FROM terms WHERE struck IS NULL AND term LIKE ? ESCAPE '^' AND kind = ? LIMIT {MOST}"  # noqa: S608
        values = (pattern, what)
    try:
        with closing(sqlite3.connect(f"{path.resolve().as_uri()}?mode=ro", uri=True, timeout=0.1)) as connection:
            return sorted(str(name) for (name,) in connection.execute(query, values))
    except sqlite3.Error:
        return []
