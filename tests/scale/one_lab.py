"""One lab of a consortium, made through the record's own door: probes read three to seven times, its fit kept.

It is also what a consortium is made of: `consortium.py` copies it under other names.
"""

from __future__ import annotations

import sqlite3
from contextlib import closing
from dataclasses import replace
from datetime import datetime, timedelta
from pathlib import Path

from electrolog.fouling.events import Events
from electrolog.lab import Lab, open_lab
from electrolog.record import amend, queries, sheets
from tests.answers.fleet_folder import ANALYTE, WAVEFORM, write_fleet
from tests.fouling.fleets.families import generator
from tests.fouling.fleets.simulate import draw

NAME = "lab000"  # stands in every label, so that a copy is the same text with another lab's name in it
ASSAY = f"{ANALYTE} {NAME}"  # a cohort is an analyte's: a consortium keeps one for each lab
FAMILY, SEED = "exponential", 7
READINGS_EACH = (3, 4, 5, 6, 7)
RIGS = ("north", "south", "east")
A_WEEK = timedelta(days=7)


def make(file: Path, probes: int) -> Path:
    """A record of one lab in a new file, with limits, standards, rigs, figures and a kept fit."""
    events = draw(replace(generator(FAMILY, SEED, probes), reading_counts=READINGS_EACH), SEED).events
    folder = file.with_suffix(".folder")
    write_fleet(events, folder, points=True)
    lab = open_lab(str(file), create=True, who="wren")
    lab.import_folder(folder)
    lab.log_plain("analytes", {"analyte": ASSAY})
    for rule, value in (("least-share-left", "60%"), ("oldest-calibration", "2d")):
        lab.set_limit(rule, value, analyte=ASSAY)
    first, last = _days(events)
    weeks = range((last - first) // A_WEEK + 1)
    for week in weeks:
        _log_standard(lab, week, first + week * A_WEEK)
    _name_all(file, first)
    _correct_some(lab)
    lab.recompute()
    lab.cohort_fit(ASSAY)
    return file


def _days(events: Events) -> tuple[datetime, datetime]:
    days = sorted(events.days)
    return datetime.fromisoformat(f"{days[0]}T00:00+00:00"), datetime.fromisoformat(f"{days[-1]}T00:00+00:00")


def _log_standard(lab: Lab, week: int, at: datetime) -> None:
    values = {"standard": f"S{week:03d}-{NAME}", "analyte": ASSAY, "prepared_at": at.isoformat()}
    lab.log_plain("standards", {**values, "concentration_um": "1mM", "relative_uncertainty": "2%"})


def _correct_some(lab: Lab) -> None:
    """One calibration in a hundred has been amended once."""
    with lab.record.writing("read off the wrong page") as writer:
        for number in range(1, queries.newest_id(writer.connection, sheets.CALIBRATIONS), 100):
            amend.amend(writer, sheets.CALIBRATIONS, number, {"noise_na": 0.06})


def _name_all(file: Path, first: datetime) -> None:
    """Labels, rigs and standards, behind the journal's back: the record of a consortium isn't verified either."""
    rig = " ".join(f"WHEN {place} THEN '{rig}-{NAME}'" for place, rig in enumerate(RIGS))
    week = f"printf('S%03d-{NAME}', CAST((julianday(at) - julianday('{first.date()}')) / 7 AS INTEGER))"
    analyte = f"(SELECT id FROM analytes WHERE analyte = '{ASSAY}')"
    with closing(sqlite3.connect(file)) as connection, connection:
        for table, label in (("batches", "batch"), ("electrodes", "electrode"), ("calibrations", "calibration")):
            connection.execute(f"UPDATE {table} SET {label} = '{NAME}-' || {label}")
        standard = f"(SELECT id FROM standards WHERE standard = {week})"
        connection.execute(
            f"UPDATE calibrations SET analyte_id = {analyte}, standard_id = {standard},"
            f" rig = CASE electrode_id % {len(RIGS)} {rig} END"
        )


RUN = ("--analyte", ASSAY, "--waveform", WAVEFORM, "--setting", "in-vivo", "--run", "2h")
