"""Rows by the names people use, words by the lab's lists; what isn't known is refused with its nearest neighbour."""

from __future__ import annotations

import re
from collections.abc import Sequence

from sqlalchemy import Connection, func, select

from electrolog.errors import InputError, UnknownName, shortened, unknown
from electrolog.record import schema
from electrolog.record.builtin import WORDS
from electrolog.record.sheets import BY_NAME, TERMS, Sheet

FOLDED = ("electrodes", "calibrations")  # sheets with an index by what differs in case alone
# A hand scanner may be set to send what kind of code it read before the text (ISO/IEC 15424: ]Q and a digit is a QR
# code), and a space or a line's end after it.
_FROM_A_SCANNER = re.compile(r"\s*(?:\]Q\d)?(.*?)\s*", re.DOTALL)


class Names:
    """A look-up for the length of one transaction; rows that it has not met are asked of the database once."""

    def __init__(self, connection: Connection) -> None:
        self._connection = connection
        self._known: dict[tuple[str, str], int] = {}
        self._added: dict[tuple[str, str], str] = {}
        self._complete: dict[str, dict[str, tuple[str, int]]] = {}
        self._words: dict[str, dict[str, str]] | None = None
        self._abbreviations: dict[str, int] | None = None

    def row_id(self, sheet: str, name: str) -> int:
        """The live row of that name: spelled so, or in other case, or an analyte's abbreviation."""
        found = self.find(sheet, name)
        if found is None:
            raise unknown(BY_NAME[sheet].one, name, [spelling for spelling, _ in self.everything(sheet).values()])
        return found

    def find(self, sheet: str, name: str) -> int | None:
        """The same, None where there is no such row."""
        found = self._known.get((sheet, name))
        if found is None:
            found = self._asked(sheet, name)
        if found is None and sheet == "electrodes" and as_scanned(name) != name:
            found = self.find(sheet, as_scanned(name))
        if found is not None:
            self._known[sheet, name] = found
        return found

    def add(self, sheet: str, name: str, row_id: int) -> None:
        """A row inserted in this transaction, which the database may not have been given yet."""
        self._added[sheet, name.casefold()] = name
        self._known[sheet, name] = row_id
        if sheet in self._complete:
            self._complete[sheet][name.casefold()] = (name, row_id)

    def add_all(self, sheet: str, names: Sequence[str], row_ids: Sequence[int]) -> None:
        """The same for many, of a sheet whose every name is known."""
        by_name = zip(names, zip(names, row_ids, strict=True), strict=True)
        self.everything(sheet).update({name.casefold(): found for name, found in by_name})

    def add_abbreviation(self, short: str, row_id: int) -> None:
        self._abbreviated().setdefault(short.casefold(), row_id)

    def spelled(self, sheet: str, name: str) -> str | None:
        """How a live row of that name is spelled, if there is one that looks the same."""
        found = self._spelled_so(sheet, name)
        if found is None and sheet == "electrodes" and as_scanned(name) != name:
            found = self._spelled_so(sheet, as_scanned(name))
        return found

    def _spelled_so(self, sheet: str, name: str) -> str | None:
        added = self._added.get((sheet, name.casefold()))
        if added is not None:
            return added
        if sheet in self._complete or not name.isascii():  # the database's own lower() knows ASCII only
            found = self.everything(sheet).get(name.casefold())
            return found[0] if found else None
        table, label = schema.tables[sheet], _label_column(BY_NAME[sheet])
        query = select(table.c[label]).where(func.lower(table.c[label]) == name.lower(), table.c.struck.is_(None))
        spellings = list(self._connection.execute(query).scalars())
        return name if name in spellings else next(iter(spellings), None)

    def everything(self, sheet: str) -> dict[str, tuple[str, int]]:
        """Every live name of a sheet, folded, with its spelling and row number."""
        if sheet not in self._complete:
            table, label = schema.tables[sheet], _label_column(BY_NAME[sheet])
            query = select(table.c[label], table.c.id).where(table.c.struck.is_(None))
            rows = self._connection.execute(query).all()
            self._complete[sheet] = {name.casefold(): (name, row_id) for name, row_id in rows}
            self._known.update({(sheet, name): row_id for name, row_id in rows})
        return self._complete[sheet]

    def word(self, kind: str, text: str) -> str:
        """The list's own spelling of a word."""
        found = self.find_word(kind, text)
        if found is None:
            hint = f"add it with `electrolog add '{kind}' '{shortened(text, 40)}'`, or as a row of terms.csv"
            raise unknown(kind, text, self.words(kind), hint)
        return found

    def find_word(self, kind: str, text: str) -> str | None:
        return self._word_lists()[kind].get(text.casefold())

    def words(self, kind: str) -> list[str]:
        return list(self._word_lists()[kind].values())

    def add_word(self, kind: str, word: str) -> None:
        self._word_lists()[kind].setdefault(word.casefold(), word)

    def _asked(self, sheet: str, name: str) -> int | None:
        if sheet not in self._complete:
            table, label = schema.tables[sheet], _label_column(BY_NAME[sheet])
            query = select(table.c.id).where(table.c[label] == name, table.c.struck.is_(None))
            found = self._connection.execute(query).scalar()
            if found is not None:
                return int(found)
            if (
                sheet in FOLDED and name.isascii()
            ):  # so many that all their names are read only for want of a better way
                folded = select(table.c.id).where(func.lower(table.c[label]) == name.lower(), table.c.struck.is_(None))
                found = self._connection.execute(folded).scalar()
                if found is not None:
                    return int(found)
        known = self.everything(sheet).get(name.casefold())
        if known is not None:
            return known[1]
        return self._abbreviated().get(name.casefold()) if sheet == "analytes" else None

    def _abbreviated(self) -> dict[str, int]:
        if self._abbreviations is None:
            table = schema.tables["analytes"]
            query = select(table.c.abbreviation, table.c.id).where(
                table.c.abbreviation.is_not(None), table.c.struck.is_(None)
            )
            self._abbreviations = {}
            for short, row_id in self._connection.execute(query.order_by(table.c.id)):
                # Folded here: the database's own lower() knows ASCII only.
                self._abbreviations.setdefault(short.casefold(), row_id)
        return self._abbreviations

    def _word_lists(self) -> dict[str, dict[str, str]]:
        if self._words is None:
            self._words = {kind: {w.casefold(): w for w in words} for kind, words in WORDS.items()}
            terms = schema.tables["terms"]
            for kind, term in self._connection.execute(
                select(terms.c.kind, terms.c.term).where(terms.c.struck.is_(None))
            ):
                self._words[kind].setdefault(term.casefold(), term)
        return self._words


def as_scanned(text: str) -> str:
    """A label without what a hand scanner put around it."""
    found = _FROM_A_SCANNER.fullmatch(text)
    return found[1] if found else text


def _label_column(sheet: Sheet) -> str:
    return sheet.key[0]


def find_row(connection: Connection, one: str, name: str) -> tuple[Sheet, int]:
    """The row that a person means by `calibration C0012` or `coating 17`, struck or not.

    Events without a label of their own go by the number that the timeline shows. Raises UnknownName.
    """
    sheet = sheet_called(one)
    table = schema.tables[sheet.name]
    if sheet.labelled:
        return sheet, Names(connection).row_id(sheet.name, name)
    if sheet is TERMS:
        return sheet, _term_id(connection, name)
    number = _row_number(name)
    if connection.execute(select(table.c.id).where(table.c.id == number)).first() is None:
        raise UnknownName(
            f"no {sheet.one} has the number '{shortened(name)}'",
            "`electrolog life PROBE` shows each event's number",
        )
    return sheet, number


def _term_id(connection: Connection, name: str) -> int:
    """A word of the lab's own: `brain phantom`, or `setting/brain phantom` where two lists hold it."""
    terms = schema.tables["terms"]
    query = select(terms.c.id, terms.c.kind, terms.c.term).where(terms.c.struck.is_(None))
    own = connection.execute(query).all()
    found = [row for row in own if name.casefold() in (row.term.casefold(), f"{row.kind}/{row.term}".casefold())]
    if not found:
        raise unknown("word of the lab's own", name, [row.term for row in own], "built-in words stay as they are")
    if len(found) > 1:
        said = ", ".join(f"'{row.kind}/{row.term}'" for row in found)
        raise InputError(f"'{shortened(name)}' stands in {len(found)} lists; accepted: {said}")
    return int(found[0].id)


def sheet_called(one: str) -> Sheet:
    """A sheet by the word for one of its rows, or by its file's name."""
    for sheet in BY_NAME.values():
        if one.casefold() in (sheet.one, sheet.name, sheet.one.replace("-", "")):
            return sheet
    if one.casefold() == "electrode":
        return BY_NAME["electrodes"]
    raise unknown("kind of row", one, [sheet.one for sheet in BY_NAME.values()])


def point_place(name: str) -> tuple[str, int]:
    """`C0012/3`: the third point of calibration C0012."""
    label, slash, place = name.rpartition("/")
    if not slash or _row_number(place) < 1:
        raise InputError(
            f"point: '{shortened(name)}' names no point; accepted: the calibration and the point's place, as in C0012/3"
        )
    return label, _row_number(place)


def _row_number(text: str) -> int:
    """-1 for what is no number, or one that no table ever reaches."""
    return int(text) if text.isascii() and text.isdigit() and len(text) < 10 else -1
