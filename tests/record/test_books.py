"""Books kept each in a way of its own come into the record as a careful person would read them."""

from __future__ import annotations

from pathlib import Path

import pytest

from electrolog.lab import Lab, open_lab
from electrolog.record.books.adoption import Adoption
from tests.record.messy_books import BOOKS, MessyBook


@pytest.fixture
def lab(tmp_path: Path) -> Lab:
    from datetime import UTC

    return open_lab(str(tmp_path / "lab.db"), zone=UTC, create=True)


@pytest.fixture(params=BOOKS, ids=lambda book: book.name)
def book(request: pytest.FixtureRequest, tmp_path: Path) -> tuple[Path, MessyBook]:
    messy: MessyBook = request.param
    path = tmp_path / messy.name
    messy.make(path)
    return path, messy


def adopted(lab: Lab, path: Path, messy: MessyBook, *, commit: bool = False) -> Adoption:
    return lab.adopt(path, answers=messy.answers, commit=commit)


HELD = ("batches", "electrodes", "coatings", "calibrations", "exposures")


def held(lab: Lab) -> dict[str, int]:
    return {sheet: len(lab.rows(sheet)) for sheet in HELD}


def test_only_what_a_book_cannot_tell_is_asked(lab: Lab, book: tuple[Path, MessyBook]) -> None:
    path, messy = book
    answers: dict[str, str] = {}
    for _ in range(len(messy.answers) + 1):
        open_questions = [one.key for one in lab.adopt(path, answers=answers).questions]
        answers |= {key: messy.answers[key] for key in open_questions}
    assert answers == messy.answers
    assert lab.adopt(path).questions == ()


def test_calibrations_come_in_as_they_stand(lab: Lab, book: tuple[Path, MessyBook]) -> None:
    path, messy = book
    adopted(lab, path, messy, commit=True)
    points: dict[str, list[tuple[float, float]]] = {}
    for row in lab.rows("calibration_points"):
        points.setdefault(row["calibration"], []).append((row["concentration_um"], row["current_na"]))
    found = [
        (
            row["electrode"],
            row["at"].date().isoformat(),
            row["stage"],
            points.get(row["calibration"]) or pytest.approx(row["sensitivity_na_um"], rel=1e-12),
        )
        for row in lab.rows("calibrations")
    ]
    assert sorted(found, key=lambda row: row[:3]) == sorted(messy.calibrations, key=lambda row: row[:3])
    assert {row["analyte"] for row in lab.rows("calibrations")} == {"dopamine"}


def test_runs_come_in_between_their_calibrations(lab: Lab, book: tuple[Path, MessyBook]) -> None:
    path, messy = book
    adopted(lab, path, messy, commit=True)
    runs = lab.rows("exposures")
    found = [(run["electrode"], run["start"].date().isoformat(), run["duration_min"], run["subject"]) for run in runs]
    assert sorted(found) == sorted(messy.runs)
    for run in runs:
        stages = {row["stage"]: row["at"] for row in lab.rows("calibrations") if row["electrode"] == run["electrode"]}
        assert stages["pre"] < run["start"]
        assert "post" not in stages or stages["post"] > run["start"]


def test_a_dry_run_writes_nothing_and_the_same_book_again_adds_nothing(lab: Lab, book: tuple[Path, MessyBook]) -> None:
    path, messy = book
    before = lab.verify()
    dry = adopted(lab, path, messy)
    assert lab.verify() == before
    written = adopted(lab, path, messy, commit=True)
    assert [(row.name, row.state) for row in dry.rows] == [(row.name, "new") for row in written.rows]
    now, entries = held(lab), lab.verify().entries
    again = lab.adopt(path, commit=True)
    assert {row.state for row in again.rows} == {"there already"}
    assert (held(lab), lab.verify().entries) == (now, entries)
    assert lab.verify().faults == ()


def test_every_row_keeps_its_cell_and_its_file(lab: Lab, book: tuple[Path, MessyBook]) -> None:
    import hashlib

    path, messy = book
    adopted(lab, path, messy, commit=True)
    fingerprint = hashlib.sha256(path.read_bytes()).hexdigest()
    reasons = [entry.reason for entry in lab.journal() if entry.reason != "built in"]
    assert len(reasons) == sum(held(lab).values())
    assert all(path.name in reason and fingerprint in reason and "!" in reason for reason in reasons)
    notes = [row["note"] for sheet in ("coatings", "calibrations", "exposures") for row in lab.rows(sheet)]
    assert all(f"from {path.name} " in note and fingerprint[:12] in note for note in notes)


def test_what_is_doubtful_is_named_with_its_cell(lab: Lab, book: tuple[Path, MessyBook]) -> None:
    path, messy = book
    found = adopted(lab, path, messy)
    assert set(messy.told) <= {remark.place for remark in found.remarks}
    assert [remark for remark in found.remarks if remark.kind == "refused"] == []
