"""Every fault of a folder is told at once, each with its file, line, column, what was found and what is accepted."""

from __future__ import annotations

import os
import time
from pathlib import Path

import pytest

from electrolog.errors import FaultyRows
from electrolog.record import exchange_files
from electrolog.record.exchange_in import import_folder
from electrolog.record.store import Record
from tests.record.exchange_folders import LAB, faults_of, lab, new_record


@pytest.fixture
def record(tmp_path: Path) -> Record:
    return new_record(tmp_path)


CALIBRATION = "calibration,electrode,at,stage,analyte,waveform,temperature_c\n"


def test_all_faults_of_all_files_come_at_once_in_their_order(record: Record, tmp_path: Path) -> None:
    files = lab(
        electrodes="electrode,batch,geometry,exposed_length_um\nP1,B1,round,75\nP2,B9,disk,-1\n",
        calibrations=CALIBRATION + "C1,P1,2026-01-05T09:00Z,pre,dopamine,triangle,warm\n"
        "C2,P2,yesterday,before,dopamin,triangel,20\n",
        calibration_points="calibration,concentration_um,current_na\nC1,1,ten\nC2,,4\nC3,1,1\n",
    )
    files["exposure.csv"] = "electrode\n"
    found = faults_of(record, tmp_path, files)
    expected = (
        ("exposure.csv: ", "no exchange file is called 'exposure.csv'; the nearest known one is 'exposures.csv'"),
        ("electrodes.csv line 2, ", "geometry", "'round'", "accepted: cylinder, disk, other"),
        ("electrodes.csv line 3, ", "exposed_length_um", "-1", "accepted: a number in µm above 0"),
        ("electrodes.csv line 3, ", "batch: no batch is called 'B9'; the nearest known one is 'B1'"),
        ("calibrations.csv line 2, ", "temperature_c: 'warm' is not a number; accepted: a number in °C"),
        ("calibrations.csv line 3, ", "at: 'yesterday' is not a time; accepted: "),
        ("calibrations.csv line 3, ", "stage", "'before'", "accepted: pre, interim, post"),
        ("calibrations.csv line 3, ", "analyte: no analyte is called 'dopamin'", "'dopamine'"),
        ("calibrations.csv line 3, ", "waveform: no waveform is called 'triangel'", "'triangle'"),
        ("calibration_points.csv line 2, ", "current_na: 'ten' is not a number"),
        ("calibration_points.csv line 3, ", "concentration_um: missing; a point needs it"),
        ("calibration_points.csv line 4, ", "calibration: no calibration is called 'C3'"),
    )
    assert len(found) == len(expected), "\n".join(found)
    for fault, parts in zip(found, expected, strict=True):
        assert fault.startswith(parts[0])
        assert all(part in fault for part in parts), fault


@pytest.mark.parametrize(
    ("file", "content", "said"),
    [
        ("electrodes.csv", "electrode,lenght_um\nP1,3\n", "line 1, lenght_um: no column of electrodes.csv is called"),
        ("electrodes.csv", "electrode,exposed_length\nP1,3\n", "the nearest known one is 'exposed_length_um'"),
        ("electrodes.csv", "note\nx\n", "line 1, electrode: this column is missing; a probe needs it"),
        ("electrodes.csv", "electrode,electrode\nP1,P1\n", "line 1, the column 'electrode' stands here twice"),
        ("electrodes.csv", "electrode,\nP1,\n", "line 1, column 2 has no name; accepted: electrode, batch"),
        ("electrodes.csv", "", "electrodes.csv: is empty; accepted: a header row such as electrode,batch"),
        ("electrodes.csv", "electrode,note\nP1\n", "line 2, found 1 cell; accepted: 2, as many as the header has"),
        ("electrodes.csv", "electrode,note\nP1,a,b\n", "line 2, found 3 cells; accepted: 2"),
        ("electrodes.csv", "electrode\nP1\nelectrode\n", "line 3, the header stands here again"),
        ("electrodes.csv", "electrode\nP1\nP2\nP1\n", "line 4, electrode: 'P1' stands on line 2 already"),
        ("electrodes.csv", "electrode\nP1\np1\n", "line 3, electrode: 'p1' differs from 'P1' on line 2 by case alone"),
        ("electrodes.csv", 'electrode,note\nP1,"a\nb"\n,x\n', "line 4, electrode: missing; a probe needs it"),
        ("electrodes.csv", 'electrode,note\nP1,"open\nP2,x\n', "line 2, this is no row of CSV"),
        ("electrodes.csv", 'electrode,note\nP1,"a"b\n', "line 2, this is no row of CSV"),
        ("electrodes.csv", "electrode,note\nP1,a\x00b\n", "line 2, note: holds a NUL character; accepted:"),
        ("electrodes.csv", f"electrode,note\nP1,{'x' * 200_000}\n", "line 2, note: 200000 characters are too many"),
        ("electrodes.csv", f"electrode\n{'P' * 201}\n", "line 2, electrode: 201 characters are too many"),
        ("electrodes.csv", b"electrode,note\nP1,caf\xe9\n", "line 2, note: holds bytes that are not UTF-8"),
        (
            "electrodes.csv",
            b"electrode,exposed_length_um\nP1,\xe9\n",
            "line 2, exposed_length_um: holds bytes that are",
        ),
        ("electrodes.csv", "electrode\nP1\n".encode("utf-16"), "line 1, the header is not text in UTF-8"),
        ("electrodes.csv", "electrode;note\nP1;x\n", "line 1, columns are parted by ';'; accepted: commas"),
        (
            "electrodes.csv",
            "electrode,exposed_length_um\nP1,1e301\n",
            "line 2, exposed_length_um: 1e301 is out of range",
        ),
        ("electrodes.csv", "electrode,exposed_length_um\nP1,1_0\n", "'1_0' is not a number"),
        (
            "electrodes.csv",
            'electrode,exposed_length_um\nP1,"7,5"\n',
            "'7,5' is not a number; accepted: a number in µm",
        ),
        ("electrodes.csv", "electrode,exposed_length_um\nP1,nan\n", "nan is out of range"),
        ("coatings.csv", "electrode,at,material\nP1,2026-01-01T00:00Z,PFSB\n", "the nearest known one is 'PFSA'"),
        ("recuts.csv", "electrode,at\nP1,2026-01-01\n", "line 2, at: '2026-01-01' is a day without a time"),
        ("limits.csv", "rule,value,origin\n", "no exchange file is called 'limits.csv'"),
        ("Batches.CSV", "batch\n", "the nearest known one is 'batches.csv'"),
    ],
)
def test_a_fault_says_where_what_and_what_is_accepted(
    record: Record, tmp_path: Path, file: str, content: str | bytes, said: str
) -> None:
    files: dict[str, str | bytes] = {"electrodes.csv": "electrode\nP1\n", file: content}
    found = faults_of(record, tmp_path, files)
    assert any(said in fault and fault.startswith(file) for fault in found), found
    for fault in found:
        assert fault.encode()
        assert len(fault) < 500


def test_a_name_kept_out_by_a_fault_makes_no_faults_of_those_that_rest_on_it(record: Record, tmp_path: Path) -> None:
    bad = LAB["electrodes.csv"].replace("P1,B1,cylinder,75", "P1,B1,cylinder,long")
    assert len(faults_of(record, tmp_path, lab(electrodes=bad))) == 1
    torn = LAB["electrodes.csv"].replace("P1,B1,cylinder,75", "P1,B1")
    assert len(faults_of(record, tmp_path, lab(electrodes=torn))) == 1
    bare = "batch,geometry\nB1,disk\n"
    assert len(faults_of(record, tmp_path, lab(electrodes=bare))) == 1


def test_rows_that_rest_on_different_rows_kept_out_are_no_doubles(record: Record, tmp_path: Path) -> None:
    cuts = "electrode,at\nP1,2026-01-01T00:00Z\nP2,2026-01-01T00:00Z\n"
    found = faults_of(record, tmp_path, lab(batches="batch,made_on\nB1,soon\n", recuts=cuts))
    assert [fault.split(":")[0] for fault in found] == ["batches.csv line 2, made_on"]


def test_a_file_too_large_to_be_held_is_refused_before_it_is_read(
    record: Record, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr(exchange_files, "MOST_BYTES", 1000)
    (found,) = faults_of(record, tmp_path, {"batches.csv": "batch\n" + "B1\n" * 400})
    assert found.startswith("batches.csv: 0.0 GB are too many; accepted: up to 1e-06 GB")


@pytest.mark.skipif(not hasattr(os, "mkfifo"), reason="this system has no pipes with a name")
def test_a_pipe_is_not_waited_for(record: Record, tmp_path: Path) -> None:
    folder = tmp_path / "piped"
    folder.mkdir()
    os.mkfifo(folder / "batches.csv")
    with pytest.raises(FaultyRows) as told:
        import_folder(record, folder)
    assert told.value.faults == ("batches.csv: is a pipe or a device; accepted: a file",)


def test_a_wrong_file_of_many_rows_is_refused_in_seconds(record: Record, tmp_path: Path) -> None:
    probes = "electrode\n" + "\n".join(f"P{number:05}" for number in range(3000))
    recuts = "electrode,at\n" + "\n".join(f"Q{number:05},2026-01-01T00:00Z" for number in range(3000))
    begun = time.process_time()
    found = faults_of(record, tmp_path, {"electrodes.csv": probes, "recuts.csv": recuts})
    assert time.process_time() - begun < 30
    assert len(found) == 3000
    assert "Q02999" in found[-1]
