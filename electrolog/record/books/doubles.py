"""Calibrations of a book that were entered already, under another label or at another time: asked about by cell."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Iterator
from datetime import datetime

from sqlalchemy import Connection

from electrolog.clock import shown_moment
from electrolog.record import queries
from electrolog.record.books.drafts import Draft, Extract
from electrolog.record.books.mapping import BookMapping
from electrolog.record.doubles import Readings, first_double, readings_of
from electrolog.record.names import Names

Assay = tuple[object, object, object]  # probe, analyte, waveform
Known = dict[Assay, list[tuple[Readings, str]]]


def without_doubles(connection: Connection, drafts: list[Draft], out: Extract, mapping: BookMapping) -> list[Draft]:
    """The drafts, less those that a person says are there already. Asks where nobody has said."""
    answer = mapping.answered("doubles")
    left: set[int] = set()
    for draft, said in _doubles(connection, [one for one in drafts if one.sheet == "calibrations"]):
        if answer == "leave":
            left.add(id(draft))
        elif not answer:
            out.ask("doubles", "Take calibrations that seem to be entered already?", f"{draft.place} {said}", CHOICES)
        out.say("left out" if answer == "leave" else "doubtful", draft.place, f"{said}: entered twice?")
    return [draft for draft in drafts if id(draft) not in left]


CHOICES = ("leave", "take")


def _doubles(connection: Connection, drafts: list[Draft]) -> Iterator[tuple[Draft, str]]:
    names = Names(connection)
    known = _of_record(connection, names, drafts)
    for draft in drafts:
        new, others = _readings(draft), known[_assay(draft)]
        found = first_double(new, others)
        if found is None:
            others.append((new, f"{draft.place}, {shown_moment(new.at)}"))
        elif names.spelled("calibrations", str(draft.values["calibration"])) is None:
            yield draft, f"holds {new.said} as {found}"


def _of_record(connection: Connection, names: Names, drafts: list[Draft]) -> Known:
    """What the record holds of the drafts' probes, those that the drafts name by their own label aside."""
    known: Known = defaultdict(list)
    electrodes = names.everything("electrodes")
    ids = [found[1] for label in {_folded(one) for one in drafts} if (found := electrodes.get(label)) is not None]
    own = {str(draft.values["calibration"]).casefold() for draft in drafts}
    for one in queries.calibrations(connection, ids) if ids else ():
        row = one.row
        if row["calibration"].casefold() not in own:
            beside = f"{row['calibration']} of the record, {shown_moment(one.at)}"
            known[row["electrode"], row["analyte"], row["waveform"]].append((readings_of(one), beside))
    return known


def _folded(draft: Draft) -> str:
    return str(draft.values["electrode"]).casefold()


def _assay(draft: Draft) -> Assay:
    return draft.values["electrode"], draft.values["analyte"], draft.values["waveform"]


def _readings(draft: Draft) -> Readings:
    at, factor = draft.values["at"], draft.values.get("sensitivity_na_um")
    assert isinstance(at, datetime)  # noqa: S101
    return Readings(at, str(draft.values["stage"]), draft.points, factor if isinstance(factor, float) else None)
