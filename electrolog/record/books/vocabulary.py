"""The names that the record knows already, which a book's words are held against."""

from __future__ import annotations

import re
from collections.abc import Mapping
from dataclasses import dataclass

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
    )


def alike(label: str) -> str:
    """The same for labels that a tired hand writes for one probe: K-07, k7, K 07."""
    folded = re.sub(r"[\s_\-./#]+", "", label.casefold())
    return re.sub(r"(?<!\d)0+(?=\d)", "", folded)
