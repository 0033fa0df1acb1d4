"""What importing an exchange folder adds, fills in, leaves alone, and refuses to overwrite."""

from __future__ import annotations

from datetime import UTC, datetime
from pathlib import Path
from zoneinfo import ZoneInfo

import pytest
from sqlalchemy import select

from electrolog.errors import InputError
from electrolog.record import amend, journal, queries, schema, sheets
from electrolog.record.exchange_in import import_folder
from electrolog.record.store import Record
from electrolog.record.verify import verify
from tests.record.exchange_folders import LAB, added, exported, faults_of, head, lab, new_record, take, write


@pytest.fixture
def record(tmp_path: Path) -> Record:
    return new_record(tmp_path)


def column(record: Record, sheet: str, name: str) -> list[object]:
    table = schema.tables[sheet]
    with record.reading() as connection:
        return list(
            connection.execute(select(table.c[name]).where(table.c.struck.is_(None)).order_by(table.c.id)).scalars()
        )


def strike(record: Record, sheet: sheets.Sheet, label: str) -> None:
    with record.writing("entered twice") as writer:
        amend.strike(writer, sheet, writer.names.row_id(sheet.name, label))


def test_a_folder_is_taken_whole_and_the_journal_tells_it(record: Record, tmp_path: Path) -> None:
    report = take(record, tmp_path, dict(LAB))
    assert added(report)["electrodes"] == (2, 0, 0)
    assert added(report)["calibration_points"] == (5, 0, 0)
    assert report.notes == ()
    with record.reading() as connection:
        assert verify(connection).whole
        reasons = {entry.reason for entry in journal.entries(connection, "calibrations")}
    assert reasons == {"import of inbox"}


def test_the_same_folder_again_changes_nothing(record: Record, tmp_path: Path) -> None:
    take(record, tmp_path, dict(LAB))
    before = head(record)
    report = take(record, tmp_path, dict(LAB))
    assert head(record) == before
    assert added(report)["calibrations"] == (0, 2, 0)
    assert added(report)["calibration_points"] == (0, 5, 0)
    assert not any(sheet.added or sheet.filled_in for sheet in report.sheets)


def test_one_fault_anywhere_keeps_every_row_out(record: Record, tmp_path: Path) -> None:
    (fault,) = faults_of(record, tmp_path, lab(retirements="electrode,at,reason\nP9,2026-01-07T10:00:00Z,fouled\n"))
    assert fault.startswith("retirements.csv line 2, electrode: no probe is called 'P9'; the nearest known one is")
    assert column(record, "electrodes", "electrode") == []


def test_replicates_keep_their_order(record: Record, tmp_path: Path) -> None:
    take(record, tmp_path, dict(LAB))
    points = schema.tables["calibration_points"]
    with record.reading() as connection:
        query = select(points.c.ordinal, points.c.concentration_um, points.c.current_na)
        found = connection.execute(query.where(points.c.calibration_id == 1).order_by(points.c.ordinal)).all()
    assert [tuple(row) for row in found] == [(1, 1.0, 10.2), (2, 0.5, 5.1), (3, 1.0, 10.1)]


def test_times_without_an_offset_are_read_in_the_zone(record: Record, tmp_path: Path) -> None:
    files = {"electrodes.csv": "electrode\nP1\n", "recuts.csv": "electrode,at\nP1,2026-07-01T12:00\n"}
    import_folder(record, write(tmp_path / "summer", dict(files)), ZoneInfo("Europe/Lisbon"))
    assert column(record, "recuts", "at") == [datetime(2026, 7, 1, 11, tzinfo=UTC)]


def test_names_are_found_by_abbreviation_and_in_other_case(record: Record, tmp_path: Path) -> None:
    take(record, tmp_path, lab(calibrations=LAB["calibrations.csv"].replace("C2,P2", "C2,p2").replace("DA", "da")))
    assert set(column(record, "calibrations", "analyte_id")) == {1}
    with record.reading() as connection:
        assert len(set(connection.execute(select(schema.tables["calibrations"].c.electrode_id)).scalars())) == 2


def test_an_abbreviation_declared_in_the_folder_counts_at_once(record: Record, tmp_path: Path) -> None:
    files = lab(
        analytes="analyte,abbreviation\nisoprenaline,ISO\n", calibrations=LAB["calibrations.csv"].replace("DA", "iso")
    )
    take(record, tmp_path, files)
    assert sorted(map(int, map(str, column(record, "calibrations", "analyte_id")))) == [1, 17]


def test_an_unknown_cell_is_filled_in_and_journalled(record: Record, tmp_path: Path) -> None:
    take(record, tmp_path, dict(LAB))
    report = take(record, tmp_path, {"electrodes.csv": "electrode,diameter_um,geometry\nP1,7,\nP2,,cylinder\n"})
    assert added(report)["electrodes"] == (0, 1, 1)
    assert column(record, "electrodes", "diameter_um") == [7.0, None]
    assert column(record, "electrodes", "geometry") == ["cylinder", "cylinder"]
    with record.reading() as connection:
        last = list(journal.entries(connection, "electrodes", 1))[-1]
        assert verify(connection).whole
    assert (last.action, last.reason, last.change) == (
        "amend",
        "import of inbox",
        {"before": {"diameter_um": None}, "after": {"diameter_um": 7.0}},
    )


def test_a_link_is_filled_in_with_a_row_of_the_same_folder(record: Record, tmp_path: Path) -> None:
    take(record, tmp_path, {"electrodes.csv": "electrode\nP1\n"})
    take(record, tmp_path, {"electrodes.csv": "electrode,batch\nP1,B7\n", "batches.csv": "batch\nB7\n"})
    assert column(record, "electrodes", "batch_id") == [1]


@pytest.mark.parametrize(
    ("file", "content"),
    [
        (
            "calibrations.csv",
            LAB["calibrations.csv"].replace("standard\n", "standard,noise_na\n").replace("S1\n", "S1,0.2\n"),
        ),
        (
            "standards.csv",
            "standard,analyte,prepared_at,concentration_um,relative_uncertainty\n"
            "S1,dopamine,2026-01-05T08:00:00Z,1000,0.05\n",
        ),
    ],
)
def test_no_figure_outlives_what_it_was_made_from(record: Record, tmp_path: Path, file: str, content: str) -> None:
    take(record, tmp_path, dict(LAB))
    with record.writing() as writer:
        queries.keep_figures(writer, {1: ("line-0", {"sensitivity_na_um": 1.0})})
    take(record, tmp_path, {file: LAB[file]})
    with record.reading() as connection:
        assert len(connection.execute(select(schema.calibration_figures)).all()) == 1
    take(record, tmp_path, {file: content})
    with record.reading() as connection:
        assert connection.execute(select(schema.calibration_figures)).all() == []
        assert verify(connection).whole


def test_what_the_record_knows_otherwise_is_a_fault_that_names_both(record: Record, tmp_path: Path) -> None:
    take(record, tmp_path, dict(LAB))
    changed = LAB["electrodes.csv"].replace("75", "57").replace("P2,B1", "P2,B2")
    faults = faults_of(record, tmp_path, lab(electrodes=changed, batches="batch\nB1\nB2\n"))
    assert faults == (
        "electrodes.csv line 2, exposed_length_um: found '57', the record has '75'; accepted: the same, or an empty"
        " cell; correct the record with `electrolog amend`",
        "electrodes.csv line 3, batch: found 'B2', the record has 'B1'; accepted: the same, or an empty cell;"
        " correct the record with `electrolog amend`",
    )


def test_an_untouched_built_in_row_takes_the_labs_columns_once(record: Record, tmp_path: Path) -> None:
    mine = "waveform,vertices_v,scan_rate_v_s,frequency_hz,note\ntriangle,-0.4 1.3 -0.4,400,60,\n"
    assert added(take(record, tmp_path, {"waveforms.csv": mine}))["waveforms"] == (0, 0, 1)
    assert column(record, "waveforms", "frequency_hz")[0] == 60.0
    assert column(record, "waveforms", "note")[0] is None
    assert added(take(record, tmp_path, {"waveforms.csv": mine}))["waveforms"] == (0, 1, 0)
    (fault,) = faults_of(record, tmp_path, {"waveforms.csv": mine.replace("60", "10")})
    assert "frequency_hz: found '10', the record has '60'" in fault


def test_a_struck_row_is_left_struck(record: Record, tmp_path: Path) -> None:
    take(record, tmp_path, dict(LAB))
    strike(record, sheets.CALIBRATIONS, "C2")
    before = head(record)
    report = take(record, tmp_path, dict(LAB))
    assert head(record) == before
    assert report.notes == ("calibrations: 1 equal a struck row and were left struck: 'C2'",)
    assert added(report)["calibration_points"] == (0, 3, 0)


def test_the_correction_of_a_struck_calibration_is_added(record: Record, tmp_path: Path) -> None:
    take(record, tmp_path, dict(LAB))
    strike(record, sheets.CALIBRATIONS, "C2")
    report = take(record, tmp_path, lab(calibration_points=LAB["calibration_points.csv"].replace("18.25", "17.25")))
    assert added(report)["calibrations"] == (1, 1, 0)
    assert added(report)["calibration_points"] == (2, 3, 0)
    assert report.notes == ()


def test_a_new_row_can_not_rest_on_a_struck_one(record: Record, tmp_path: Path) -> None:
    take(record, tmp_path, {"electrodes.csv": "electrode\nP1\nP2\n"})
    strike(record, sheets.ELECTRODES, "P2")
    files: dict[str, str | bytes] = {"electrodes.csv": "electrode\nP1\nP2\n"}
    files["recuts.csv"] = "electrode,at\nP2,2026-01-05T08:00Z\n"
    assert faults_of(record, tmp_path, files) == (
        "recuts.csv line 2, electrode: 'P2' was struck; accepted: a live electrodes row",
    )


def test_other_points_of_a_calibration_in_the_record_are_a_fault(record: Record, tmp_path: Path) -> None:
    take(record, tmp_path, dict(LAB))
    (fault,) = faults_of(record, tmp_path, {"calibration_points.csv": LAB["calibration_points.csv"] + "C1,2,20\n"})
    assert fault.startswith(
        "calibration_points.csv line 2, calibration: found 4 points for 'C1', the record has 3 other points"
    )


def test_the_points_alone_are_there_already_in_any_order(record: Record, tmp_path: Path) -> None:
    take(record, tmp_path, dict(LAB))
    header, *points = LAB["calibration_points.csv"].splitlines()
    report = take(record, tmp_path, {"calibration_points.csv": "\n".join([header, *reversed(points)])})
    assert added(report) == {"calibration_points": (0, 5, 0)}


def test_a_sensitivity_is_refused_where_points_exist_in_the_file_or_in_the_record(
    record: Record, tmp_path: Path
) -> None:
    head_line = "calibration,electrode,at,stage,analyte,waveform,sensitivity_na_um\n"
    rows = "C1,P1,2026-01-05T08:00:00Z,pre,dopamine,triangle,10\n"
    (fault,) = faults_of(record, tmp_path, lab(calibrations=head_line + rows + rows.replace("C1", "C2")))[:1]
    assert fault.startswith("calibrations.csv line 2, sensitivity_na_um: refused where points exist")
    take(record, tmp_path, dict(LAB))
    (fault,) = faults_of(record, tmp_path, {"calibrations.csv": head_line + rows})
    assert fault.startswith("calibrations.csv line 2, sensitivity_na_um: refused where points exist")


def test_a_built_in_word_as_a_term_changes_nothing(record: Record, tmp_path: Path) -> None:
    before = head(record)
    report = take(record, tmp_path, {"terms.csv": "kind,term,meaning\nmedium,pbs,our buffer\n"})
    assert (added(report), head(record)) == ({"terms": (0, 1, 0)}, before)
    assert exported(record, tmp_path / "out")["terms.csv"] == b"kind,term,meaning\r\n"


def test_words_take_the_lists_own_spelling(record: Record, tmp_path: Path) -> None:
    take(record, tmp_path, lab(coatings=LAB["coatings.csv"].replace("PFSA", "pfsa")))
    assert column(record, "coatings", "material") == ["PFSA"]


def test_a_byte_order_mark_and_foreign_line_ends_are_accepted(record: Record, tmp_path: Path) -> None:
    take(record, tmp_path, {"electrodes.csv": b"\xef\xbb\xbfelectrode\r\nP1\r\n\r\nP2"})
    take(record, tmp_path, {"electrodes.csv": b"electrode\rP3\r"})
    assert column(record, "electrodes", "electrode") == ["P1", "P2", "P3"]


@pytest.mark.parametrize("kind", ["absent", "file", "empty", "foreign"])
def test_a_folder_that_is_none_is_refused(record: Record, tmp_path: Path, kind: str) -> None:
    folder = tmp_path / "inbox"
    if kind == "file":
        folder.write_text("", encoding="utf-8")
    elif kind != "absent":
        write(folder, {} if kind == "empty" else {"photo.png": b"", "notes.txt": b"", ".calibrations.csv.part": b""})
    said = {"absent": "there is no folder", "file": "is a file; accepted: a folder"}
    with pytest.raises(InputError, match=said.get(kind, "holds none of the exchange files; accepted: terms.csv, ")):
        import_folder(record, folder)
