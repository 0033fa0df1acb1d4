"""How one lab's books are to be understood: kept as a small TOML file that a person can read and edit."""

from __future__ import annotations

import json
import tomllib
from collections.abc import Mapping as Dictionary
from dataclasses import dataclass, field, replace
from pathlib import Path
from typing import Any

from electrolog.errors import InputError, unknown
from electrolog.record.books.headings import Meaning, checked, described, meaning
from electrolog.texts import small_text

TIMES = {"pre": "09:00", "interim": "12:00", "run": "12:00", "post": "18:00", "coating": "08:00"}
SECTIONS = ("answers", "times", "spellings", "words", "headings", "sheets")
ENDING = ".adopt.toml"


@dataclass(frozen=True)
class BookMapping:
    """`answers` by the question's key; `times` of day where a cell has only a day; `spellings` of probes' labels;
    `words` of the lab's lists; `headings` by their text.
    """

    answers: Dictionary[str, str] = field(default_factory=dict)
    times: Dictionary[str, str] = field(default_factory=lambda: dict(TIMES))
    spellings: Dictionary[str, str] = field(default_factory=dict)
    words: Dictionary[str, str] = field(default_factory=dict)
    headings: Dictionary[str, Meaning] = field(default_factory=dict)
    skip: tuple[str, ...] = ()

    def understand(self, heading: str) -> Meaning | None:
        """What the file says of a heading, or else what its words say; None: kept in the row's note."""
        found = self.headings.get(" ".join(heading.split())) or meaning(heading)
        return None if found is None or found.field == "other" else found

    def answered(self, key: str) -> str:
        return self.answers.get(key, "")

    def with_answers(self, answers: Dictionary[str, str]) -> BookMapping:
        """`same:k07` is an answer about a spelling, anything else about the book."""
        spellings = {key.removeprefix("same:"): value for key, value in answers.items() if key.startswith("same:")}
        plain = {key: value for key, value in answers.items() if not key.startswith("same:")}
        return replace(self, answers={**self.answers, **plain}, spellings={**self.spellings, **spellings})


def usual_file(book: Path) -> Path:
    return book.with_name(book.stem + ENDING)


def read_mapping(path: Path) -> BookMapping:
    """Raises InputError that names what in the file can't be taken."""
    try:
        found = tomllib.loads(small_text(path, "a mapping file made by adopt"))
    except tomllib.TOMLDecodeError as why:
        raise InputError(f"{path.name}: is no TOML ({why})", "correct it, or delete it and run adopt again") from None
    for section in found:
        if section not in SECTIONS:
            raise unknown(f"section of {path.name}", section, SECTIONS)
    texts = {name: _texts(path, name, found.get(name, {})) for name in SECTIONS[:4]}
    headings = {text: _meaning(path, text, said) for text, said in _table(path, "headings", found).items()}
    skip = _table(path, "sheets", found).get("skip", [])
    if not isinstance(skip, list) or not all(isinstance(name, str) for name in skip):
        raise InputError(f'{path.name}: sheets.skip is no list of names; accepted: such as skip = ["Notes"]')
    times = {**TIMES, **texts["times"]}
    return BookMapping(texts["answers"], times, texts["spellings"], texts["words"], headings, tuple(skip))


def _table(path: Path, name: str, found: Dictionary[str, Any]) -> dict[str, Any]:
    table = found.get(name, {})
    if not isinstance(table, dict):
        raise InputError(f"{path.name}: [{name}] is no table; accepted: [{name}] with lines of name = value below")
    return table


def _texts(path: Path, name: str, table: Any) -> dict[str, str]:
    for key, value in _table(path, name, {name: table}).items():
        if not isinstance(value, str):
            raise InputError(f'{path.name}: {name}.{key} is no text; accepted: such as {key} = "…"')
    return {key: value for key, value in table.items() if value}


def _meaning(path: Path, heading: str, said: Any) -> Meaning:
    if not isinstance(said, dict) or "field" not in said:
        raise InputError(f'{path.name}: heading "{heading}" has no field; accepted: such as {{field = "sensitivity"}}')
    allowed = {"field": str, "unit": str, "inverted": bool, "stage": str, "concentration_um": (int, float)}
    for key, value in said.items():
        if key not in allowed:
            raise unknown(f'key of heading "{heading}"', key, allowed)
        if not isinstance(value, allowed[key]):  # type: ignore[arg-type]
            raise InputError(f'{path.name}: {key} of heading "{heading}" is {value!r}; accepted: as adopt writes it')
    found = checked(Meaning(**said, why=f"by {path.name}"), heading)
    by_its_words = meaning(heading)
    return by_its_words if by_its_words and replace(by_its_words, why=found.why) == found else found


def write_mapping(path: Path, mapping: BookMapping, book: str) -> None:
    lines = [f"# How {json.dumps(book)} is read. Edit it and run `electrolog adopt` again.", "", "[answers]"]
    lines += [f"{_key(key)} = {_text(value)}" for key, value in mapping.answers.items()]
    lines += ["", "# The time of day where a cell has only a day.", "[times]"]
    lines += [f"{_key(key)} = {_text(value)}" for key, value in mapping.times.items()]
    for section, about, table in (
        ("spellings", "Labels of probes: as the book has them = as the record is to have them.", mapping.spellings),
        ("words", "Words of the book = words of the lab's lists.", mapping.words),
    ):
        lines += ["", f"# {about}", f"[{section}]", *(f"{_key(key)} = {_text(value)}" for key, value in table.items())]
    lines += ["", "# Sheets that hold nothing for the record.", "[sheets]"]
    lines += [f"skip = [{', '.join(map(_text, mapping.skip))}]", "", "[headings]"]
    lines += [f"{_text(heading)} = {_inline(found)}" for heading, found in mapping.headings.items()]
    try:
        path.write_text("\n".join(lines) + "\n", encoding="utf-8")
    except OSError as why:
        raise InputError(
            f"{path}: can't be written: {why.strerror}", "name another place for the mapping with --mapping FILE"
        ) from None


def _inline(found: Meaning) -> str:
    parts = [f"field = {_text(found.field)}"]
    parts += [f"unit = {_text(found.unit)}"] if found.unit else []
    parts += ["inverted = true"] if found.inverted else []
    parts += [f"stage = {_text(found.stage)}"] if found.stage else []
    parts += [f"concentration_um = {found.concentration_um!r}"] if found.concentration_um is not None else []
    why = "kept in the note" if found.field == "other" else f"{described(found)}: {found.why}"
    return f"{{{', '.join(parts)}}}  # {_one_line(why)}"


def _key(text: str) -> str:
    return text if text.isascii() and text.replace("_", "").replace("-", "").isalnum() else _text(text)


def _text(text: str) -> str:
    return json.dumps(text, ensure_ascii=False).replace("\x7f", "\\u007f")


def _one_line(text: str) -> str:
    return "".join(sign if sign.isprintable() else " " for sign in text)
