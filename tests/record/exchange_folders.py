"""Small exchange folders of an invented lab, written and read back for the tests of import and export."""

from __future__ import annotations

import tempfile
from datetime import UTC
from functools import cache
from pathlib import Path

import pytest

from electrolog.errors import FaultyRows
from electrolog.record import journal
from electrolog.record.exchange_in import ImportReport, import_folder
from electrolog.record.exchange_out import export_folder
from electrolog.record.store import Record, open_record
from electrolog.record.verify import verify

LAB = {
    "terms.csv": "kind,term,meaning\nmedium,tap broth,what was at hand\n",
    "batches.csv": "batch,made_on,fibre\nB1,2026-01-02,carbon fibre 7 um\n",
    "electrodes.csv": "electrode,batch,geometry,exposed_length_um\nP1,B1,cylinder,75\nP2,B1,cylinder,80.5\n",
    "coatings.csv": "electrode,at,material,method,layers\nP1,2026-01-03T10:00:00Z,PFSA,dip,3\n",
    "standards.csv": "standard,analyte,prepared_at,concentration_um\nS1,dopamine,2026-01-05T08:00:00Z,1000\n",
    "calibrations.csv": (
        "calibration,electrode,at,stage,analyte,waveform,medium,temperature_c,standard\n"
        "C1,P1,2026-01-05T09:00:00+01:00,pre,dopamine,triangle,tap broth,23.5,S1\n"
        "C2,P2,2026-01-05T10:00:00Z,pre,DA,triangle,,,S1\n"
    ),
    "calibration_points.csv": (
        "calibration,concentration_um,current_na\nC1,1,10.2\nC1,0.5,5.1\nC2,1,9\nC1,1,10.1\nC2,2,18.25\n"
    ),
    "exposures.csv": "electrode,start,duration_min,setting,waveform\nP1,2026-01-06T10:00:00Z,240,in-vivo,triangle\n",
    "retirements.csv": "electrode,at,reason\nP1,2026-01-07T10:00:00Z,fouled\n",
}


def write(folder: Path, files: dict[str, str | bytes]) -> Path:
    folder.mkdir(exist_ok=True)
    for name, content in files.items():
        (folder / name).write_bytes(content if isinstance(content, bytes) else content.encode())
    return folder


def lab(**changed: str) -> dict[str, str | bytes]:
    """The lab's files with some put in place of others: lab(batches="...")."""
    return {**LAB, **{f"{name}.csv": content for name, content in changed.items()}}


@cache
def empty_record() -> bytes:
    """A new record's file, made once: the migrations take longer than most tests."""
    with tempfile.TemporaryDirectory() as folder:
        made = Path(folder) / "empty.db"
        open_record(str(made), "tester", create=True)
        return made.read_bytes()


def new_record(folder: Path, name: str = "record.db") -> Record:
    (folder / name).write_bytes(empty_record())
    return open_record(str(folder / name), "tester")


def take(record: Record, folder: Path, files: dict[str, str | bytes]) -> ImportReport:
    """Imports these files and nothing else, times in UTC."""
    inbox = folder / "inbox"
    if inbox.exists():
        for path in inbox.iterdir():
            path.unlink()
    return import_folder(record, write(inbox, files), UTC)


def faults_of(record: Record, folder: Path, files: dict[str, str | bytes]) -> tuple[str, ...]:
    """The faults; that nothing was written is asserted here, once for all."""
    before = head(record)
    with pytest.raises(FaultyRows) as refused:
        take(record, folder, files)
    assert head(record) == before
    assert refused.value.message.startswith(f"{len(refused.value.faults)} fault")
    with record.reading() as connection:
        assert verify(connection).whole
    return refused.value.faults


def head(record: Record) -> tuple[int, str]:
    with record.reading() as connection:
        return journal.head(connection)


def exported(record: Record, folder: Path) -> dict[str, bytes]:
    export_folder(record, folder)
    return {path.name: path.read_bytes() for path in folder.iterdir()}


def added(report: ImportReport) -> dict[str, tuple[int, int, int]]:
    return {sheet.sheet: (sheet.added, sheet.already_there, sheet.filled_in) for sheet in report.sheets}
