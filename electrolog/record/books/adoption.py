"""Adopting a book from its file to the record: what was understood, what is asked, what would be or was written."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, replace
from datetime import tzinfo
from pathlib import Path

from electrolog.errors import InputError, shortened, unknown
from electrolog.record.books.days import ORDERS
from electrolog.record.books.doubles import CHOICES, without_doubles
from electrolog.record.books.drafts import Draft, Extract, Question, Remark
from electrolog.record.books.extraction import Extraction
from electrolog.record.books.grid import Book
from electrolog.record.books.headings import Meaning, described
from electrolog.record.books.mapping import BookMapping, read_mapping, usual_file, write_mapping
from electrolog.record.books.measured import NEEDED, units_of
from electrolog.record.books.opening import open_book
from electrolog.record.books.taking_in import Origin, take_in, unique
from electrolog.record.books.vocabulary import vocabulary
from electrolog.record.columns import Value
from electrolog.record.store import Record

WAITING = "waits for an answer"
FREE = ("analyte", "waveform", "setting", "rig", "by")
ACCEPTED = {
    "stage": ("pre", "interim", "post"),
    "date_order": ORDERS,
    "decimal_mark": (".", ","),
    "sheet_name": ("probe", "subject", "nothing"),
    "blank_probe": ("above", "refuse"),
    "coated": ("before", "note"),
    "doubles": CHOICES,
    "run_day": ("pre", "post"),
    "probe_columns": ("probes", "nothing"),
    "struck": ("take", "leave"),
    **{f"unit_{field}": units_of(field) for field in NEEDED},
}


@dataclass(frozen=True)
class Understood:
    heading: str
    place: str
    meaning: str
    why: str


@dataclass(frozen=True)
class AdoptedRow:
    """`state`: new, there already, filled in, left struck, or waiting for an answer."""

    sheet: str
    name: str
    place: str
    state: str
    values: dict[str, Value]
    points: tuple[tuple[float, float], ...]


@dataclass(frozen=True)
class Adoption:
    book: str
    fingerprint: str
    mapping_file: str
    committed: bool
    headings: tuple[Understood, ...]
    questions: tuple[Question, ...]
    rows: tuple[AdoptedRow, ...]
    remarks: tuple[Remark, ...]
    notes: tuple[str, ...]

    def count(self, state: str) -> int:
        return sum(row.state == state for row in self.rows)


def adopt(
    record: Record,
    path: Path,
    *,
    mapping_file: Path | None = None,
    answers: Mapping[str, str] | None = None,
    commit: bool = False,
    zone: tzinfo | None = None,
) -> Adoption:
    """Reads a book by its mapping, which is made where there is none and saved with the answers.

    Nothing is written to the record without `commit`, and then all rows or none. Days without an offset are days of
    `zone` (None: the machine's). Raises InputError for a book or a mapping that can't be read, and on `commit`
    where a question is open.
    """
    book = open_book(path)
    file = mapping_file or usual_file(path)
    kept = read_mapping(file) if file.exists() else None
    mapping = (kept or BookMapping()).with_answers(answers or {})
    _refuse_strange(mapping.answers)
    with record.reading() as connection:
        known = vocabulary(connection)
    out = Extraction(book, mapping, known, zone).run()
    mapping = replace(mapping, headings=_learned(out, mapping))
    if mapping != kept:  # a file that somebody edited keeps its look as long as nothing is new
        write_mapping(file, mapping, book.name)
    with record.reading() as connection:
        drafts = without_doubles(connection, unique(out), out, mapping)
    open_questions = [one for one in out.questions.values() if not one.key.startswith("same:")]
    if commit and open_questions:
        raise _unanswered(book, open_questions, file)
    states: dict[int, str] = {}
    if not open_questions:
        origin = Origin(book.name, book.fingerprint)
        states = take_in(record, drafts, out, origin, commit)
    rows = tuple(_row(draft, states.get(id(draft), WAITING)) for draft in drafts)
    headings = tuple(_understood(heading, place, mapping) for heading, place in out.headings.items())
    return Adoption(
        book.name, book.fingerprint, str(file), commit, headings, tuple(out.questions.values()), rows,
        tuple(out.remarks), book.notes,
    )  # fmt: skip


def _learned(out: Extract, mapping: BookMapping) -> dict[str, Meaning]:
    found = {heading: mapping.understand(heading) or Meaning("other") for heading in out.headings if heading}
    return {**found, **mapping.headings}


def _understood(heading: str, place: str, mapping: BookMapping) -> Understood:
    found = mapping.understand(heading)
    if found is None:
        return Understood(heading, place, "kept in the note", "says nothing known")
    return Understood(heading, place, described(found), found.why)


def _row(draft: Draft, state: str) -> AdoptedRow:
    values: dict[str, Value] = {name: value for name, value in draft.values.items() if value is not None}
    name = str(draft.values.get("calibration") or draft.values.get("electrode") or draft.values.get("batch"))
    return AdoptedRow(draft.sheet, name, draft.place, state, values, draft.points)


def _refuse_strange(answers: Mapping[str, str]) -> None:
    """An answer that no question takes would be lost without a word."""
    for key, value in answers.items():
        asked = ACCEPTED.get(key)
        if asked is not None and value not in asked:
            raise InputError(f"answer {key}: '{shortened(value)}' is none; accepted: {', '.join(asked)}")
        if asked is None and key not in FREE:
            raise unknown("question", key, [*ACCEPTED, *FREE])


def _unanswered(book: Book, questions: list[Question], file: Path) -> InputError:
    said = "; ".join(f"{one.key}: {one.text} ({one.why})" for one in questions)
    keys = " ".join(f"--answer {one.key}=…" for one in questions)
    return InputError(
        f"{book.name}: nothing was written, since this is not known: {said}", f"{keys}, or in {file.name}"
    )
