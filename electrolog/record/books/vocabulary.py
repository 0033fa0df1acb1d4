"""The names that the record knows already, which a book's words are held against."""

from __future__ import annotations

import re
from collections.abc import Mapping
from dataclasses import dataclass, field
from datetime import datetime

from sqlalchemy import Connection

from electrolog.record import sheets
from electrolog.record.names import Names
from electrolog.record.readable import rows


@dataclass(frozen=True)
class Vocabulary:
    """Folded name -> the record's spelling."""

    analytes: Mapping[str, str]
    waveforms: Mapping[str, str]
    media: Mapping[str, str]
    settings: Mapping[str, str]
    probes: Mapping[str, str]  # folded as `alike` does
    coatings: Mapping[str, str] = field(default_factory=dict)  # materials
    standards: Mapping[str, str] = field(default_factory=dict)
    coated: Mapping[tuple[str, str], datetime] = field(default_factory=dict)  # probe and material: the first time


def vocabulary(connection: Connection) -> Vocabulary:
    analytes = {}
    for row in rows(connection, sheets.ANALYTES):
        analytes[str(row["analyte"]).casefold()] = str(row["analyte"])
        if row["abbreviation"]:
            analytes[str(row["abbreviation"]).casefold()] = str(row["analyte"])
    names = Names(connection)
    return Vocabulary(
        analytes,
        {key: name for key, (name, _) in names.everything("waveforms").items()},
        {word.casefold(): word for word in names.words("medium")},
        {word.casefold(): word for word in names.words("setting")},
        {alike(name): name for name, _ in names.everything("electrodes").values()},
        {word.casefold(): word for word in names.words("coating material")},
        {key: name for key, (name, _) in names.everything("standards").items()},
        _coated(connection),
    )


def _coated(connection: Connection) -> dict[tuple[str, str], datetime]:
    first: dict[tuple[str, str], datetime] = {}
    for row in rows(connection, sheets.COATINGS):
        key = row["electrode"], row["material"]
        first[key] = min(row["at"], first.get(key, row["at"]))
    return first


def alike(label: str) -> str:
    """The same for labels that a tired hand writes for one probe: K-07, k7, K 07."""
    folded = re.sub(r"[\s_\-./#]+", "", label.casefold())
    return re.sub(r"(?<!\d)0+(?=\d)", "", folded)
