"""What is exported can be read back into an empty record, and comes out as the same bytes."""

from __future__ import annotations

import csv
import io
import tempfile
from datetime import datetime
from pathlib import Path

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from electrolog.errors import RecordError
from electrolog.record import amend, exchange_out, sheets
from electrolog.record.exchange_in import import_folder
from electrolog.record.exchange_out import export_folder
from electrolog.record.verify import verify
from tests.record.exchange_folders import LAB, exported, head, new_record, take

HOSTILE = (
    'a "quoted" word, and a comma',
    "two\nlines\r\nthree\rfour",
    "=1+1",
    "+cmd|' /C calc'!A0",
    "@sum",
    " spaces around ",
    "\ttab",
    "🧪 électrode µ μ",
    "\u202eright to left\u200f",
    "[bold]x[/]",
    "\x1b[31mred\x1b[0m",
    "NULL",
    "nan",
    '"',
    "\ufeff",
    "x" * 10_000,
)


def again(folder: Path, first: dict[str, bytes]) -> dict[str, bytes]:
    other = new_record(folder, "other.db")
    import_folder(other, folder / "out")
    with other.reading() as connection:
        assert verify(connection).whole
    return exported(other, folder / "out2")


def test_a_lab_comes_back_byte_for_byte(tmp_path: Path) -> None:
    record = new_record(tmp_path)
    take(record, tmp_path, dict(LAB))
    first = exported(record, tmp_path / "out")
    assert again(tmp_path, first) == first
    assert first["calibration_points.csv"].decode() == (
        "calibration,concentration_um,current_na\r\nC1,1,10.2\r\nC1,0.5,5.1\r\nC1,1,10.1\r\nC2,1,9\r\nC2,2,18.25\r\n"
    )
    assert b"\r\nC1,P1,2026-01-05T08:00:00Z,pre,dopamine,triangle,tap broth,23.5,S1," in first["calibrations.csv"]


def test_hostile_texts_come_back_as_they_were(tmp_path: Path) -> None:
    record = new_record(tmp_path)
    buffer = io.StringIO(newline="")
    csv.writer(buffer).writerows([("batch", "note"), *((f"B{i}", text) for i, text in enumerate(HOSTILE))])
    take(record, tmp_path, {"batches.csv": buffer.getvalue()})
    first = exported(record, tmp_path / "out")
    with (tmp_path / "out" / "batches.csv").open(encoding="utf-8", newline="") as stream:
        notes = {row["batch"]: row["note"] for row in csv.DictReader(stream)}
    assert notes == {f"B{i}": text for i, text in enumerate(HOSTILE)}
    assert again(tmp_path, first) == first


texts = st.text(st.characters(exclude_categories=["Cs"], exclude_characters="\x00"), min_size=1, max_size=30)
signs = st.characters(exclude_categories=["Cs", "Cc", "Zl", "Zp"])
labels = st.text(signs, min_size=1, max_size=30).map(str.strip).filter(bool)
numbers = st.floats(-1e60, 1e60)


@settings(max_examples=25)
@given(
    probes=st.lists(st.tuples(labels, texts), min_size=1, max_size=6, unique_by=lambda probe: probe[0].casefold()),
    points=st.lists(st.tuples(st.floats(0, 1e9), numbers), max_size=8),
    moment=st.datetimes(datetime(1970, 1, 2), datetime(2199, 12, 30)),
)
def test_whatever_a_cell_can_hold_comes_back(
    probes: list[tuple[str, str]], points: list[tuple[float, float]], moment: datetime
) -> None:
    with tempfile.TemporaryDirectory() as name:
        folder = Path(name)
        record = new_record(folder)
        write = {
            "electrodes.csv": [("electrode", "note"), *probes],
            "calibrations.csv": [
                ("calibration", "electrode", "at", "stage", "analyte", "waveform"),
                *((label, label, f"{moment}Z", "pre", "serotonin", "serotonin-n") for label, _ in probes),
            ],
            "calibration_points.csv": [
                ("calibration", "concentration_um", "current_na"),
                *((probes[0][0], c, i) for c, i in points),
            ],
        }
        files: dict[str, str | bytes] = {}
        for file, rows in write.items():
            buffer = io.StringIO(newline="")
            csv.writer(buffer).writerows(rows)
            files[file] = buffer.getvalue()
        take(record, folder, files)
        first = exported(record, folder / "out")
        with (folder / "out" / "calibration_points.csv").open(encoding="utf-8", newline="") as stream:
            assert [(float(c), float(i)) for _, c, i in list(csv.reader(stream))[1:]] == points
        with (folder / "out" / "electrodes.csv").open(encoding="utf-8", newline="") as stream:
            assert [row["electrode"] for row in csv.DictReader(stream)] == sorted(label for label, _ in probes)
        assert again(folder, first) == first
        before = head(record)
        import_folder(record, folder / "out")
        assert head(record) == before


def test_an_amended_built_in_row_comes_back_amended(tmp_path: Path) -> None:
    record = new_record(tmp_path)
    with record.writing("the lab's own use") as writer:
        row_id = writer.names.row_id("waveforms", "triangle")
        amend.amend(writer, sheets.WAVEFORMS, row_id, {"frequency_hz": 60.0, "note": None})
        amend.amend(writer, sheets.ANALYTES, writer.names.row_id("analytes", "DA"), {"abbreviation": None})
    first = exported(record, tmp_path / "out")
    assert b"triangle,-0.4 1.3 -0.4,400,60,\r\n" in first["waveforms.csv"]
    assert b"dopamine,,51-61-6" in first["analytes.csv"]
    assert again(tmp_path, first) == first


def test_struck_rows_and_the_points_of_struck_calibrations_stay_behind(tmp_path: Path) -> None:
    record = new_record(tmp_path)
    take(record, tmp_path, dict(LAB))
    with record.writing("wrong probe") as writer:
        calibration = writer.names.row_id("calibrations", "C2")
        amend.strike(writer, sheets.CALIBRATIONS, calibration)
        amend.strike(writer, sheets.POINTS, writer.names.row_id("calibrations", "C1"), ordinal=2)
    first = exported(record, tmp_path / "out")
    assert b"C2" not in first["calibrations.csv"]
    assert first["calibration_points.csv"].split(b"\r\n")[1:-1] == [b"C1,1,10.2", b"C1,1,10.1"]
    assert again(tmp_path, first) == first


def test_labels_stand_in_the_order_of_their_code_points(tmp_path: Path) -> None:
    record = new_record(tmp_path)
    take(record, tmp_path, {"electrodes.csv": "electrode\n\U0001f600\nb\n\uffee\nB2\nA\nä\nz\n"})
    found = exported(record, tmp_path / "out")["electrodes.csv"].decode().split("\r\n")[1:-1]
    assert [line.split(",")[0] for line in found] == ["A", "B2", "b", "z", "ä", "\uffee", "\U0001f600"]


def test_only_our_own_files_are_replaced_and_nothing_is_left_lying(tmp_path: Path) -> None:
    record = new_record(tmp_path)
    (tmp_path / "out").mkdir()
    (tmp_path / "out" / "plan.txt").write_text("kept", encoding="utf-8")
    (tmp_path / "out" / "batches.csv").write_text("old", encoding="utf-8")
    report = export_folder(record, tmp_path / "out")
    names = {path.name for path in (tmp_path / "out").iterdir()}
    assert names == {f"{sheet}.csv" for sheet in report.rows} | {"datapackage.json", "plan.txt"}
    assert (tmp_path / "out" / "plan.txt").read_text(encoding="utf-8") == "kept"
    assert (tmp_path / "out" / "batches.csv").read_text(encoding="utf-8").startswith("batch,made_on")


def test_a_failed_export_leaves_the_old_file_whole(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    record = new_record(tmp_path)
    before = exported(record, tmp_path / "out")

    def fails(*_: object) -> object:
        yield "half a "
        raise OSError(28, "No space left on device")

    monkeypatch.setattr(exchange_out, "_csv", fails)
    with pytest.raises(RecordError, match="can't be written"):
        export_folder(record, tmp_path / "out")
    assert {path.name: path.read_bytes() for path in (tmp_path / "out").iterdir()} == before


def test_a_file_in_the_folders_place_is_refused(tmp_path: Path) -> None:
    (tmp_path / "out").write_text("a file", encoding="utf-8")
    with pytest.raises(RecordError, match="is a file"):
        export_folder(new_record(tmp_path), tmp_path / "out")
