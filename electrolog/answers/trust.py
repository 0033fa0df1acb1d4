"""Whether the record can be trusted: its rows against its journal, its kept figures against its raw points, and its
kept fits as they were kept."""

from __future__ import annotations

import math
from dataclasses import replace
from typing import Any

from electrolog.answers import figures as made
from electrolog.fouling.fit import METHOD as FIT_METHOD
from electrolog.measure.version import METHOD
from electrolog.record import kept_fits, queries
from electrolog.record.queries import Calibration
from electrolog.record.store import Record
from electrolog.record.verify import Verification, verify

SAME = 1e-6  # relative: two machines may differ in the last digits, nobody forges those


def verified(record: Record, head: str | None = None) -> Verification:
    """Figures are no part of the journal, since they can be made again; so they are, where the rows are whole."""
    with record.reading() as connection:
        found = verify(connection, head)
        if not found.whole:
            return found
        kept = [one for one in queries.calibrations(connection) if (one.figures or {}).get("method") == METHOD]
        uncertainties = made.standards_uncertainties(connection)
        fits = kept_fits.changed(connection, FIT_METHOD)
    faults = [fault for one in kept for fault in _forged(one, uncertainties)]
    faults += [f"kept fit of {one}: was changed since it was kept; the next question makes it again" for one in fits]
    return replace(found, faults=tuple(faults))


def _forged(calibration: Calibration, uncertainties: dict[str, float | None]) -> list[str]:
    kept, fresh = calibration.figures or {}, made.computed(calibration, uncertainties).to_dict()
    label = calibration.row["calibration"]
    return [
        f"calibration {label}: its kept {name} is {kept.get(name)!r}, its raw points give {fresh[name]!r};"
        " `electrolog recompute` makes it again"
        for name in fresh
        if not _same(kept.get(name), fresh[name])
    ]


def _same(kept: Any, fresh: Any) -> bool:
    numbers = [isinstance(value, int | float) for value in (kept, fresh)]
    if all(numbers):
        return math.isclose(kept, fresh, rel_tol=SAME, abs_tol=1e-12)
    return not any(numbers)
