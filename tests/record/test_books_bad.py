"""Books that must not come in as they are: each refusal names its cell or its file, and nothing is half written."""

from __future__ import annotations

import csv
import zipfile
from collections.abc import Callable, Sequence
from datetime import UTC, date, datetime, time
from pathlib import Path
from typing import Any

import openpyxl
import pytest
from hypothesis import given
from hypothesis import strategies as st

from electrolog.answers.calibrating import NewCalibration
from electrolog.errors import InputError
from electrolog.lab import Lab, open_lab
from electrolog.record.books.extraction import Extraction
from electrolog.record.books.grid import Book, Grid, tidy
from electrolog.record.books.mapping import BookMapping
from electrolog.record.books.opening import MOST_BYTES, MOST_UNPACKED, open_book
from electrolog.record.books.vocabulary import Vocabulary

HEADS = ["Probe", "Date", "Stage", "Sens. (nA/uM)", "Note"]
ANSWERS = {"analyte": "dopamine", "waveform": "triangle"}
GOOD = ["K-1", "2024-03-04", "pre", 12.0, ""]


@pytest.fixture
def lab(tmp_path: Path) -> Lab:
    return open_lab(str(tmp_path / "lab.db"), zone=UTC, create=True)


@pytest.fixture
def book(tmp_path: Path) -> Callable[..., Path]:
    def made(*rows: Sequence[Any], name: str = "book.xlsx") -> Path:
        path = tmp_path / name
        if name.endswith(".csv"):
            with path.open("w", encoding="utf-8", newline="") as stream:
                csv.writer(stream).writerows([HEADS, *rows])
            return path
        workbook = openpyxl.Workbook()
        for row in (HEADS, *rows):
            workbook.active.append(row)
        workbook.save(path)
        return path

    return made


def refusal(path: Path) -> str:
    with pytest.raises(InputError) as refused:
        open_book(path)
    return refused.value.message


def remarks(lab: Lab, path: Path, kind: str = "refused", **answers: str) -> dict[str, str]:
    found = lab.adopt(path, answers={**ANSWERS, **answers}).remarks
    return {one.place: one.said for one in found if one.kind == kind}


# --- the file itself ------------------------------------------------------------------------------------------


def test_a_book_of_200_mb_is_refused_before_it_is_read(tmp_path: Path) -> None:
    path = tmp_path / "traces.xlsx"
    with path.open("wb") as stream:
        stream.truncate(200 * 2**20)
    assert f"200 MB are too many; accepted: up to {MOST_BYTES // 2**20} MB" in refusal(path)


def test_a_zip_bomb_is_refused_while_it_unpacks(tmp_path: Path) -> None:
    path = tmp_path / "bomb.xlsx"
    with zipfile.ZipFile(path, "w", zipfile.ZIP_DEFLATED, compresslevel=1) as archive:
        archive.writestr("xl/workbook.xml", "<workbook/>")
        packed = archive.open  # takes bytes, for which there is no encoding to name
        with packed("xl/worksheets/sheet1.xml", "w", force_zip64=True) as member:
            for _ in range(MOST_UNPACKED // 2**24 + 1):
                member.write(bytes(2**24))
    assert path.stat().st_size < MOST_BYTES
    assert "unpack to more than" in refusal(path)


def test_one_cell_in_the_far_corner_is_refused_by_its_name(tmp_path: Path) -> None:
    path = tmp_path / "corner.xlsx"
    workbook = openpyxl.Workbook()
    workbook.active["XFD1048576"] = 1
    workbook.save(path)
    assert "reaches to cell XFD1048576" in refusal(path)


def test_a_repeated_cell_of_an_open_document_is_refused(tmp_path: Path) -> None:
    path = tmp_path / "repeated.ods"
    repeated = 'table:number-columns-repeated="16000" office:value-type="float" office:value="1"'
    cell = f"<table:table-cell {repeated}><text:p>1</text:p></table:table-cell>"
    row = f'<table:table-row table:number-rows-repeated="1000000">{cell}</table:table-row>'
    with zipfile.ZipFile(path, "w") as archive:
        archive.writestr("content.xml", f"<office:document-content>{row}</office:document-content>")
        archive.writestr("META-INF/manifest.xml", "<manifest/>")
    assert "accepted: up to" in refusal(path)


@pytest.mark.parametrize("name", ["locked.xlsx", "locked.xls"])
def test_a_password_is_told_from_damage(tmp_path: Path, name: str) -> None:
    """An encrypted workbook is a compound file with a stream of this name ([MS-OFFCRYPTO] 2.3.4.4)."""
    path = tmp_path / name
    path.write_bytes(
        b"\xd0\xcf\x11\xe0\xa1\xb1\x1a\xe1" + bytes(1016) + "EncryptedPackage".encode("utf-16-le") + bytes(64)
    )
    assert refusal(path) == f"{name}: is locked by a password; accepted: a copy saved without one"


def test_a_locked_open_document_is_told(tmp_path: Path) -> None:
    path = tmp_path / "locked.ods"
    with zipfile.ZipFile(path, "w") as archive:
        archive.writestr("content.xml", bytes(100))
        archive.writestr("META-INF/manifest.xml", "<manifest:encryption-data/>")
    assert "locked by a password" in refusal(path)


@pytest.mark.parametrize("cut", [b"shortened in front", b"packed wrongly"])
def test_an_archive_that_was_overwritten_is_told(tmp_path: Path, cut: bytes) -> None:
    path = tmp_path / "a.xlsx"
    with zipfile.ZipFile(path, "w", zipfile.ZIP_DEFLATED) as archive:
        archive.writestr("xl/workbook.xml", bytes(range(256)) * 20)
    whole = path.read_bytes()
    if cut == b"shortened in front":  # the table at the end then points before the beginning
        path.write_bytes(whole[:8] + whole[20:])
    else:
        start = 30 + len("xl/workbook.xml")
        path.write_bytes(whole[:start] + b"\xff" * 40 + whole[start + 40 :])
    assert "a.xlsx" in refusal(path)


@pytest.mark.parametrize(
    ("name", "content", "said"),
    [
        ("a.xlsx", b"Probe,Date\n", "is named .xlsx and holds csv"),
        ("a", b"Probe,Date\n", "is named without an ending and holds csv"),
        ("a.pdf", b"Probe,Date\n", "is named .pdf and holds csv"),
        ("a.xlsx", b"PK\x03\x04junk", "is damaged"),
        ("a.xls", b"\xd0\xcf\x11\xe0\xa1\xb1\x1a\xe1" + bytes(600), "can't be read as a spreadsheet"),
        ("a.csv", b"", "is empty"),
        ("a.csv", b"\x00\x01\x02", "is no spreadsheet"),
    ],
)
def test_a_file_that_is_something_else_is_named(tmp_path: Path, name: str, content: bytes, said: str) -> None:
    path = tmp_path / name
    path.write_bytes(content)
    assert said in refusal(path)
    assert name in refusal(path)


def test_a_workbook_under_the_name_of_a_text_is_told(book: Callable[..., Path]) -> None:
    path = book(GOOD).rename(book(GOOD).with_suffix(".csv"))
    assert "is named .csv and holds xlsx" in refusal(path)


def test_what_is_not_there_is_said(tmp_path: Path) -> None:
    assert "can't be read" in refusal(tmp_path / "none.xlsx")
    assert "is a folder" in refusal(tmp_path)


def test_a_book_without_a_table_says_what_would_be_one(lab: Lab, tmp_path: Path) -> None:
    path = tmp_path / "letters.csv"
    path.write_text("dear all,\nplease order glass,\n", encoding="utf-8")
    with pytest.raises(InputError, match=r"no table .* was found; accepted: headings such as"):
        lab.adopt(path)


# --- its cells ------------------------------------------------------------------------------------------------


def test_a_formula_is_never_evaluated(lab: Lab, book: Callable[..., Path]) -> None:
    path = book(
        GOOD, ["K-2", "2024-03-04", "pre", "=HYPERLINK(1)", ""], ["K-3", "2024-03-04", "pre", 2.0, "=cmd|' /C calc'!A0"]
    )
    lab.adopt(path, answers=ANSWERS, commit=True)
    assert [row["electrode"] for row in lab.rows("calibrations")] == [
        "K-1",
        "K-3",
    ]  # no value was kept with the formula
    assert not any("HYPERLINK" in str(row) or "cmd" in str(row) for row in lab.rows("calibrations"))


def test_a_hidden_sheet_is_read_and_said_to_be_hidden(lab: Lab, book: Callable[..., Path]) -> None:
    path = book(GOOD)
    workbook = openpyxl.load_workbook(path)
    workbook.create_sheet("front")
    workbook.active = 1
    workbook["Sheet"].sheet_state = "hidden"
    workbook.save(path)
    found = lab.adopt(path, answers=ANSWERS)
    assert found.count("new") == 2
    assert any("'Sheet' is hidden" in note for note in found.notes)


def test_two_spellings_are_asked_about_and_not_decided(lab: Lab, book: Callable[..., Path]) -> None:
    path = book(GOOD, ["k 01", "2024-03-05", "pre", 11.0, ""], ["K-1", "2024-03-06", "pre", 10.0, ""])
    assert "may be 'K-1' in another spelling" in remarks(lab, path)["Sheet!A3:E3"]
    assert remarks(lab, path, **{"same:k 01": "K-1"}) == {}
    lab.adopt(path, commit=True)
    assert [row["electrode"] for row in lab.rows("electrodes")] == ["K-1"]
    assert len(lab.rows("calibrations")) == 3


def test_a_spelling_is_held_against_the_record_too(lab: Lab, book: Callable[..., Path]) -> None:
    lab.make_probes(["K-001"])
    assert "may be 'K-001'" in remarks(lab, book(GOOD))["Sheet!A2:E2"]


def test_a_blank_probe_is_asked_about(lab: Lab, book: Callable[..., Path]) -> None:
    path = book(GOOD, ["", "2024-03-05", "post", 11.0, ""])
    assert "blank_probe" in [one.key for one in lab.adopt(path, answers=ANSWERS).questions]
    lab.adopt(path, answers={"blank_probe": "above"}, commit=True)
    assert [row["electrode"] for row in lab.rows("calibrations")] == ["K-1", "K-1"]


def test_a_repeated_calibration_is_taken_once_and_a_contradiction_not_at_all(
    lab: Lab, book: Callable[..., Path]
) -> None:
    path = book(GOOD, GOOD, ["K-2", "2024-03-04", "pre", 5.0, ""], ["K-2", "2024-03-04", "pre", 6.0, ""])
    assert remarks(lab, path, "left out") == {"Sheet!A3:E3": "repeats Sheet!A2:E2: taken once"}
    refused = remarks(lab, path)
    assert set(refused) == {"Sheet!A4:E4", "Sheet!A5:E5"}
    assert "stands at Sheet!A5:E5" in refused["Sheet!A4:E4"]
    lab.adopt(path, commit=True)
    assert [row["sensitivity_na_um"] for row in lab.rows("calibrations")] == [12.0]


def test_a_date_in_the_future_is_named_with_its_cell(
    lab: Lab, book: Callable[..., Path], monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setenv("ELECTROLOG_NOW", "2024-06-01T12:00Z")
    path = book(
        GOOD,
        ["K-2", date(2025, 1, 1), "pre", 5.0, ""],
        ["K-3", 45000.0, "pre", 5.0, ""],
        ["K-4", "31.2.24", "pre", 5.0, ""],
    )
    refused = remarks(lab, path)
    assert "2025-01-01 at Sheet!B3 lies in the future" in refused["Sheet!A3:E3"]
    assert "the number 45000 is no date" in refused["Sheet!A4:E4"]
    assert "'31.2.24'" in refused["Sheet!A5:E5"]


@pytest.mark.parametrize(
    ("row", "said"),
    [
        (["", "2024-03-04", "pre", 1.0, ""], "probe: missing"),
        (["K-9", "", "pre", 1.0, ""], "date: missing"),
        (["K-9", "2024-03-04", "late", 1.0, ""], "no stage is called 'late'"),
        (["K-9", "2024-03-04", "pre", "twelve", ""], "Sheet!D3"),
        (["K-9", "2024-03-04", "pre", "3 mV", ""], "Sheet!D3"),
        (["K-9", "2024-03-04", "pre", 1e300, ""], "sensitivity_na_um: 1e+300 is out of range"),
        (["K" * 300, "2024-03-04", "pre", 1.0, ""], "characters are too many"),
    ],
)
def test_a_row_that_cannot_be_taken_says_why_and_the_rest_comes_in(
    lab: Lab, book: Callable[..., Path], row: list[Any], said: str
) -> None:
    path = book(GOOD, row)
    refused = remarks(lab, path, blank_probe="refuse")
    assert list(refused) == ["Sheet!A3:E3"]
    assert said in refused["Sheet!A3:E3"]
    lab.adopt(path, commit=True)
    assert [one["electrode"] for one in lab.rows("calibrations")] == ["K-1"]
    assert lab.verify().faults == ()


def test_an_open_question_keeps_everything_out(lab: Lab, book: Callable[..., Path]) -> None:
    entries = lab.verify().entries
    with pytest.raises(InputError, match=r"nothing was written.*analyte: What was measured\?") as refused:
        lab.adopt(book(GOOD), answers={"waveform": "triangle"}, commit=True)
    assert "--answer analyte=…" in refused.value.hint
    assert lab.verify().entries == entries


@pytest.mark.parametrize(
    ("answers", "said"),
    [
        ({"weather": "fine"}, "no question is called 'weather'"),
        ({"stage": "later"}, "answer stage: 'later' is none; accepted: pre, interim, post"),
        ({"analyte": "dopamin", "waveform": "triangle"}, "the nearest known one is 'dopamine'"),
    ],
)
def test_an_answer_that_is_none_is_refused(
    lab: Lab, book: Callable[..., Path], answers: dict[str, str], said: str
) -> None:
    try:
        found = " ".join(one.said for one in lab.adopt(book(GOOD), answers=answers).remarks)
    except InputError as why:
        found = why.message
    assert said in found


# --- again, with the record's own voice -------------------------------------------------------------------------


def test_a_book_that_has_grown_adds_what_is_new(lab: Lab, book: Callable[..., Path]) -> None:
    lab.adopt(book(GOOD), answers=ANSWERS, commit=True)
    grown = lab.adopt(
        book(["K-0", "2024-01-01", "pre", 3.0, ""], GOOD, ["K-1", "2024-03-05", "post", 9.0, ""]), commit=True
    )
    states = {row.name: row.state for row in grown.rows if row.sheet == "calibrations"}
    assert states == {
        "K-0_2024-01-01_pre_dopamine": "new",
        "K-1_2024-03-04_pre_dopamine": "there already",
        "K-1_2024-03-05_post_dopamine": "new",
    }


def test_the_book_never_changes_what_the_record_says(lab: Lab, book: Callable[..., Path]) -> None:
    lab.adopt(book(GOOD), answers=ANSWERS, commit=True)
    entries = lab.verify().entries
    changed = lab.adopt(book(["K-1", "2024-03-04", "pre", 13.0, ""]), commit=True)
    said = [one.said for one in changed.remarks if one.kind == "refused"]
    assert len(said) == 1
    assert "found '13', the record has '12'" in said[0]
    assert lab.verify().entries == entries


def test_what_was_struck_stays_struck(lab: Lab, book: Callable[..., Path]) -> None:
    path = book(GOOD)
    lab.adopt(path, answers=ANSWERS, commit=True)
    lab.strike("calibration", "K-1_2024-03-04_pre_dopamine", "wrong probe")
    again = lab.adopt(path, commit=True)
    assert [row.state for row in again.rows if row.sheet == "calibrations"] == ["left struck"]
    assert lab.rows("calibrations") == []


def test_an_edited_mapping_is_obeyed_and_keeps_its_look(lab: Lab, book: Callable[..., Path]) -> None:
    path = book(["K-1", "2024-03-04", "pre", 12.0, "0.4"])
    lab.adopt(path, answers=ANSWERS)
    file = path.with_name("book.adopt.toml")
    text = file.read_text(encoding="utf-8").replace(
        '"Note" = {field = "note"}', '"Note" = {field = "sensitivity_se", unit = "nA/uM"}'
    )
    file.write_text(f"# ours\n{text}", encoding="utf-8")
    lab.adopt(path, commit=True)
    assert lab.rows("calibrations")[0]["sensitivity_se_na_um"] == 0.4
    assert file.read_text(encoding="utf-8") == f"# ours\n{text}"


@pytest.mark.parametrize(
    ("text", "said"),
    [
        ("[answers", "is no TOML"),
        ("[colours]\nred = 'x'", "no section of .* is called 'colours'"),
        ("[headings]\nDate = {field = 'dya'}", "no field is called 'dya'; the nearest known one is 'day'"),
        ("[headings]\nDate = {field = 'current', unit = 'V'}", "the unit 'V' doesn't belong to current"),
        ("[headings]\nDate = {field = 'current', stage = 'late'}", "the stage 'late' is none"),
        ("[headings]\nDate = {field = 3}", "field of heading"),
        ("[headings]\nDate = 'day'", "has no field"),
        ("[answers]\nstage = 3", "is no text"),
        ("answers = 3", "is no table"),
        ("[sheets]\nskip = 'Notes'", "is no list of names"),
    ],
)
def test_a_mapping_that_cannot_be_obeyed_says_where(lab: Lab, book: Callable[..., Path], text: str, said: str) -> None:
    path = book(GOOD)
    path.with_name("book.adopt.toml").write_text(text, encoding="utf-8")
    with pytest.raises(InputError, match=said):
        lab.adopt(path)


CELLS = st.one_of(
    st.none(),
    st.sampled_from(
        [*HEADS, "K-1", "pre", "Post", "[DA] µM", "0.5 µM", "nA", "conc (uM)", "Probe: K", "Mean", "<LOD", "~"]
    ),
    st.floats(allow_nan=False, allow_infinity=False),
    st.text(max_size=8),
    st.booleans(),
    st.dates(date(1900, 1, 1), date(2100, 1, 1)),
    st.datetimes(datetime(1900, 1, 1), datetime(2100, 1, 1)),
    st.just(time(9, 30)),
)


@given(st.lists(st.lists(CELLS, max_size=6), max_size=8))
def test_no_grid_of_cells_brings_the_reader_down(rows: list[list[Any]]) -> None:
    known = Vocabulary({"da": "dopamine"}, {"triangle": "triangle"}, {"pbs": "PBS"}, {"slice": "slice"}, {})
    book = Book("any.xlsx", "0" * 64, (Grid("any", tidy([HEADS, GOOD, *rows])), Grid("more", tidy(rows))))
    out = Extraction(book, BookMapping(), known, UTC).run()
    assert [draft.values["electrode"] for draft in out.of("calibrations")][:1] == ["K-1"]


def test_a_sensitivity_that_is_not_above_zero_is_doubtful(lab: Lab, book: Callable[..., Path]) -> None:
    path = book(GOOD, ["K-2", "2024-03-04", "pre", -8.0, ""])
    assert remarks(lab, path, "doubtful") == {
        "Sheet!D3": "a sensitivity of -8 nA/µM is not above zero: is its sign right?"
    }


# --- columns that may be probes ---------------------------------------------------------------------------------


def grid_book(tmp_path: Path, *rows: str) -> Path:
    path = tmp_path / "grid.csv"
    path.write_text("\n".join(rows), encoding="utf-8")
    return path


@pytest.mark.parametrize("head", ["Date,weight,volume", "Date,0.5,1", "Date,X-1,X-1", "Date,gold standard,X-2"])
def test_columns_that_look_like_no_probes_are_not_taken_for_them(lab: Lab, tmp_path: Path, head: str) -> None:
    with pytest.raises(InputError, match="no table of calibrations or runs"):
        lab.adopt(grid_book(tmp_path, head, "2024-03-04,301,2", "2024-03-05,305,2.5"))


def test_columns_that_may_be_probes_are_asked_about_unless_the_record_knows_them(lab: Lab, tmp_path: Path) -> None:
    path = grid_book(tmp_path, "Date,X-1,X-2", "2024-03-04,301,2", "2024-03-05,305,2.5")
    asked = {one.key: one.why for one in lab.adopt(path).questions}
    assert asked["probe_columns"] == "'X-1, X-2' at grid!B1"
    with pytest.raises(InputError, match="no table of calibrations or runs"):
        lab.adopt(path, answers={"probe_columns": "nothing"})
    path.with_name("grid.adopt.toml").unlink()
    lab.make_probes(["X-1", "X-2"])
    assert "probe_columns" not in {one.key for one in lab.adopt(path).questions}


def test_an_entry_of_a_probes_column_names_that_columns_cells(lab: Lab, tmp_path: Path) -> None:
    path = grid_book(tmp_path, "Date,X-1,X-2", "2024-03-04,3,2", "2024-03-05,,2.5")
    answers = {**ANSWERS, "probe_columns": "probes", "stage": "pre", "unit_sensitivity": "nA/uM"}
    found = lab.adopt(path, answers=answers)
    assert [row.place for row in found.rows if row.sheet == "calibrations"] == ["grid!B2", "grid!C2", "grid!C3"]
    assert [one for one in found.remarks if one.kind != "doubtful"] == []


def test_labelled_cells_right_above_the_headings_are_no_headings(lab: Lab, tmp_path: Path) -> None:
    rows = ("Analyte,dopamine", "Operator,wren,,Rig,north", "Probe,Date,Stage,nA/µM", "R-1,2024-05-02,pre,10")
    found = lab.adopt(grid_book(tmp_path, *rows), answers={"waveform": "triangle"})
    (taken,) = (row.values for row in found.rows if row.sheet == "calibrations")
    assert [taken[name] for name in ("analyte", "by", "rig")] == ["dopamine", "wren", "north"]


# --- entered already ----------------------------------------------------------------------------------------------


def test_a_calibration_that_the_record_has_under_another_label_is_asked_about(
    lab: Lab, book: Callable[..., Path]
) -> None:
    path = book(GOOD, ["K-2", "2024-03-04", "pre", 8.0, ""])
    lab.make_probes(["K-1"])
    typed = {"electrode": "K-1", "at": "2024-03-04T14:00Z", "stage": "pre", "analyte": "DA", "waveform": "triangle"}
    lab.calibrate([NewCalibration({**typed, "sensitivity_na_um": "12nA/uM"})])
    found = lab.adopt(path, answers=ANSWERS)
    (asked,) = found.questions
    assert (asked.key, asked.accepted) == ("doubles", ("leave", "take"))
    assert asked.why.startswith("Sheet!A2:E2 holds the same factor as C0001 of the record, 2024-03-04 ")
    assert "entered twice?" in remarks(lab, path, "doubtful")["Sheet!A2:E2"]
    left = lab.adopt(path, answers={"doubles": "leave"}, commit=True)
    assert [row.name for row in left.rows if row.sheet == "calibrations"] == ["K-2_2024-03-04_pre_dopamine"]
    assert len(lab.rows("calibrations")) == 2
    lab.adopt(path, answers={"doubles": "take"}, commit=True)
    assert len(lab.rows("calibrations")) == 3
    again = lab.adopt(path, answers={"doubles": "leave"})
    assert [row.state for row in again.rows] == ["there already"] * 4


def test_points_that_a_book_holds_twice_are_asked_about(lab: Lab, tmp_path: Path) -> None:
    path = tmp_path / "twice.csv"
    rows = (
        "K-1,2024-03-04,09:00,pre,5.1,10.2",
        "K-1,2024-03-04,09:10,pre,5.1,10.2",
        "K-1,2024-03-09,09:00,pre,5.1,10.2",
    )
    path.write_text("\n".join(("Probe,Date,Time,Stage,0.5 uM (nA),1 uM (nA)", *rows)), encoding="utf-8")
    (asked,) = lab.adopt(path, answers=ANSWERS).questions
    assert asked.why == "twice!A3:F3 holds the same 2 points as twice!A2:F2, 2024-03-04 09:00"
    lab.adopt(path, answers={"doubles": "leave"}, commit=True)
    assert [row["at"].isoformat() for row in lab.rows("calibrations")] == [
        "2024-03-04T09:00:00+00:00",
        "2024-03-09T09:00:00+00:00",
    ]
