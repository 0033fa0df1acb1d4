"""How one column is read, checked, kept and written. The sheets in sheets.py are made of these."""

from __future__ import annotations

import unicodedata
from dataclasses import dataclass
from datetime import UTC, date, datetime, tzinfo

from electrolog.clock import iso_utc, parse_day, parse_iso, parse_moment
from electrolog.errors import InputError, shortened
from electrolog.units import PLAIN, Unit, parse_quantity

Value = str | float | datetime | date | None
TEXT_LIMIT, LABEL_LIMIT = 100_000, 200
LARGEST = 1e60  # where a column sets no bound of its own; its fourth power, which a fit may need, is a number still


@dataclass(frozen=True)
class Column:
    """A column: its name (with its unit, where it holds a number), what it may hold, and what it means."""

    name: str
    about: str
    required: bool = False

    def read(self, text: str, zone: tzinfo | None = None) -> Value:
        """A cell of an exchange file. Raises InputError with what was found and what would be accepted."""
        raise NotImplementedError

    def read_typed(self, text: str, zone: tzinfo | None = None) -> Value:
        """The same as a person types it, which is more lenient: units, `yesterday 14:30`."""
        return self.read(text, zone)

    def write(self, value: Value) -> str:
        return "" if value is None else str(value)


@dataclass(frozen=True)
class Text(Column):
    def read(self, text: str, zone: tzinfo | None = None) -> Value:
        return checked_text(text, self.name, TEXT_LIMIT)


@dataclass(frozen=True)
class Label(Column):
    """A name that people type again: one line, no stray spaces, of a length that fits on a sticker's record."""

    def read(self, text: str, zone: tzinfo | None = None) -> Value:
        label = checked_text(text.strip(), self.name, LABEL_LIMIT)
        if not label.isprintable() and any(unicodedata.category(c) in ("Cc", "Zl", "Zp") for c in label):
            raise InputError(
                f"{self.name}: '{shortened(label)}' holds a control character; accepted: printable signs on one line"
            )
        if label and not any(unicodedata.category(c)[0] in "LNPS" for c in label):
            raise InputError(f"{self.name}: holds no visible sign; accepted: a name that people can type again")
        return label


@dataclass(frozen=True)
class Word(Label):
    """A word of a list: built in, or added by the lab."""

    kind: str = ""


@dataclass(frozen=True)
class Link(Label):
    """The name of a row in another sheet."""

    to: str = ""


@dataclass(frozen=True)
class Choice(Column):
    choices: tuple[str, ...] = ()

    def read(self, text: str, zone: tzinfo | None = None) -> Value:
        found = text.strip().casefold()
        if found not in self.choices:
            raise InputError(f"{self.name}: found '{shortened(text)}'; accepted: {', '.join(self.choices)}")
        return found


@dataclass(frozen=True)
class Number(Column):
    unit: Unit = PLAIN
    above: float | None = None
    least: float | None = None
    most: float | None = None
    whole: bool = False

    def read(self, text: str, zone: tzinfo | None = None) -> Value:
        try:
            value = float(text)
        except ValueError:
            raise InputError(f"{self.name}: '{shortened(text)}' is not a number; {self.accepted}") from None
        if "_" in text:  # Python's own notation, nobody's in a CSV file
            raise InputError(f"{self.name}: '{shortened(text)}' is not a number; {self.accepted}")
        return self.checked(value, text)

    def read_typed(self, text: str, zone: tzinfo | None = None) -> Value:
        return self.checked(parse_quantity(text, self.unit, self.name), text)

    def checked(self, value: float, text: str) -> float:
        outside = (
            not abs(value) <= LARGEST  # so written, NaN is outside too
            or (self.above is not None and value <= self.above)
            or (self.least is not None and value < self.least)
            or (self.most is not None and value > self.most)
            or (self.whole and value != round(value))
        )
        if outside:
            raise InputError(f"{self.name}: {shortened(text)} is out of range; {self.accepted}")
        return value + 0.0  # -0.0 becomes 0.0, which is written the same way again

    @property
    def accepted(self) -> str:
        bounds = [
            f"above {number_text(self.above)}" if self.above is not None else "",
            f"at least {number_text(self.least)}" if self.least is not None else "",
            f"at most {number_text(self.most)}" if self.most is not None else "",
        ]
        kind = "a whole number" if self.whole else "a number"
        unit = f" in {self.unit.sign}" if self.unit.sign else ""
        limits = " and ".join(b for b in bounds if b)
        return f"accepted: {kind}{unit}{' ' + limits if limits else ', . as its decimal mark'}"

    def write(self, value: Value) -> str:
        return "" if value is None else number_text(float(value))  # type: ignore[arg-type]


@dataclass(frozen=True)
class Moment(Column):
    def read(self, text: str, zone: tzinfo | None = None) -> Value:
        return parse_iso(text, zone, self.name)

    def read_typed(self, text: str, zone: tzinfo | None = None) -> Value:
        return parse_moment(text, zone, self.name)

    def write(self, value: Value) -> str:
        return iso_utc(value) if isinstance(value, datetime) else ""


@dataclass(frozen=True)
class Day(Column):
    def read(self, text: str, zone: tzinfo | None = None) -> Value:
        return parse_day(text, zone, self.name)

    def write(self, value: Value) -> str:
        return value.isoformat() if isinstance(value, date) else ""


@dataclass(frozen=True)
class Vertices(Column):
    """Potentials in V, space-separated: first the holding potential, last where the scan ends."""

    def read(self, text: str, zone: tzinfo | None = None) -> Value:
        parts = text.replace("\u2212", "-").replace(",", " ").replace("→", " ").split()
        if len(parts) < 2:
            raise InputError(
                f"{self.name}: '{shortened(text)}' has fewer than two potentials; accepted: such as '-0.4 1.3 -0.4'"
            )
        bound = Number(self.name, "", least=-10, most=10)
        return " ".join(bound.write(bound.read(part)) for part in parts)


def checked_text(text: str, what: str, limit: int) -> str:
    if len(text) > limit:
        raise InputError(f"{what}: {len(text)} characters are too many; accepted: up to {limit}")
    if "\x00" in text:
        raise InputError(f"{what}: holds a NUL character; accepted: any other text")
    try:
        text.encode()
    except UnicodeEncodeError:
        raise InputError(f"{what}: holds bytes that are not UTF-8; accepted: text in UTF-8") from None
    return text


def number_text(value: float) -> str:
    """The shortest text that reads back as the same number: 2.0 -> '2', 0.1 -> '0.1'."""
    return repr(float(value)).removesuffix(".0")


def as_utc(value: datetime) -> datetime:
    """What a driver gave back: PostgreSQL gives the server's zone, SQLite text that was UTC."""
    return value.replace(tzinfo=UTC) if value.tzinfo is None else value.astimezone(UTC)
