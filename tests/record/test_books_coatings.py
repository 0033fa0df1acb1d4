"""The coating and the standard that a book names: into rows of their own where that may be, and otherwise said."""

from __future__ import annotations

from datetime import UTC, datetime
from pathlib import Path

import pytest

from electrolog.lab import Lab, open_lab
from electrolog.record.books.adoption import Adoption

HEADS = "Probe,Date,Stage,Sens. (nA/uM),Coating,Coated on,Standard"
USUAL = {"analyte": "DA", "waveform": "triangle"}


@pytest.fixture
def lab(tmp_path: Path) -> Lab:
    return open_lab(str(tmp_path / "lab.db"), zone=UTC, create=True)


def adopted(lab: Lab, folder: Path, *rows: str, commit: bool = True, **answers: str) -> Adoption:
    path = folder / "book.csv"
    path.write_text("\n".join([HEADS, *rows]), encoding="utf-8")
    return lab.adopt(path, answers={**USUAL, **answers}, commit=commit)


def coated(lab: Lab) -> list[tuple[str, str, datetime]]:
    return sorted((row["electrode"], row["material"], row["at"]) for row in lab.rows("coatings"))


def remarks(found: Adoption) -> dict[str, str]:
    return {one.place: one.said for one in found.remarks}


def test_a_coating_with_its_day_becomes_a_row(lab: Lab, tmp_path: Path) -> None:
    adopted(lab, tmp_path, "K-1,2024-03-04,pre,12,pfsa,2024-03-02,", "K-1,2024-03-05,post,9,PFSA,2024-03-02,")
    assert coated(lab) == [("K-1", "PFSA", datetime(2024, 3, 2, 8, tzinfo=UTC))]
    (row,) = lab.rows("coatings")
    assert row["note"].startswith("from book.csv book!A2:G2 (")
    assert lab.verify().faults == ()


def test_a_coating_without_a_day_is_asked_about(lab: Lab, tmp_path: Path) -> None:
    rows = ("K-1,2024-03-05,post,9,PFSA,,", "K-1,2024-03-04,pre,12,PFSA,,", "K-2,2024-03-04,pre,8,bare,,")
    (asked,) = (one for one in adopted(lab, tmp_path, *rows, commit=False).questions)
    assert (asked.key, asked.accepted) == ("coated", ("before", "note"))
    adopted(lab, tmp_path, *rows, coated="before")
    assert coated(lab) == [("K-1", "PFSA", datetime(2024, 3, 4, 8, tzinfo=UTC))]
    assert lab.rows("coatings")[0]["note"].startswith("day of coating assumed; from book.csv book!A3:G3")
    earlier = adopted(lab, tmp_path, "K-1,2024-03-01,pre,13,PFSA,,", *rows)
    assert [row.state for row in earlier.rows if row.sheet == "coatings"] == ["there already"]
    assert len(lab.rows("calibrations")) == 4
    assert lab.verify().faults == ()


def test_a_coating_may_stay_in_the_note(lab: Lab, tmp_path: Path) -> None:
    found = adopted(lab, tmp_path, "K-1,2024-03-04,pre,12,PFSA,,", "K-2,2024-03-04,pre,8,goo,,", coated="note")
    assert coated(lab) == []
    assert [row["note"].split(";")[0] for row in lab.rows("calibrations")] == ["Coating: PFSA", "Coating: goo"]
    assert "'goo' is no word of the list 'coating material'" in remarks(found)["book!E3"]


def test_a_second_coating_of_a_probe_is_a_second_row(lab: Lab, tmp_path: Path) -> None:
    adopted(
        lab, tmp_path, "K-1,2024-03-04,pre,12,PFSA,,", "K-1,2024-04-04,pre,9,PEDOT,,", "K-1,2024-04-05,post,8,PEDOT,,",
        coated="before",
    )  # fmt: skip
    days = [(material, at.date().isoformat()) for _, material, at in coated(lab)]
    assert days == [("PEDOT", "2024-04-04"), ("PFSA", "2024-03-04")]


def test_a_day_of_coating_that_is_none_is_said(lab: Lab, tmp_path: Path) -> None:
    found = adopted(lab, tmp_path, "K-1,2024-03-04,pre,12,PFSA,last week,", coated="before")
    assert "'last week' is no date" in remarks(found)["book!F2"]
    assert len(coated(lab)) == 1


def test_a_standard_is_linked_once_the_record_has_it(lab: Lab, tmp_path: Path) -> None:
    rows = ("K-1,2024-03-04,pre,12,,,s-7", "K-2,2024-03-04,pre,8,,,n/a")
    found = adopted(lab, tmp_path, *rows)
    assert "'s-7' is no standard of the record: kept in the note" in remarks(found)["book!G2"]
    assert lab.rows("calibrations")[0]["note"].startswith("Standard: s-7; ")
    standard = {"standard": "S-7", "analyte": "dopamine", "prepared_at": "2024-03-01T08:00Z"}
    lab.log_plain("standards", {**standard, "concentration_um": "10mM"})
    again = adopted(lab, tmp_path, *rows)
    assert [(row.name[:3], row.state) for row in again.rows if row.sheet == "calibrations"] == [
        ("K-1", "filled in"),
        ("K-2", "there already"),
    ]
    assert [row["standard"] for row in lab.rows("calibrations")] == ["S-7", None]
