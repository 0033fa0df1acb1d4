"""What one kind of row is, and the columns that several kinds share."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property

from electrolog import units
from electrolog.record.columns import Column, Link, Moment, Number, Text


@dataclass(frozen=True)
class Sheet:
    """One kind of row: `key` names the columns that tell one live row from another."""

    name: str
    one: str
    about: str
    columns: tuple[Column, ...]
    key: tuple[str, ...]
    exchanged: bool = True

    @cached_property
    def by_name(self) -> dict[str, Column]:
        return {column.name: column for column in self.columns}

    @cached_property
    def labelled(self) -> bool:
        """Whether a person names a row by its label; any other row goes by its number."""
        return len(self.key) == 1 and not isinstance(self.by_name[self.key[0]], Link)

    @cached_property
    def time_column(self) -> str | None:
        """Where the row stands in a probe's life; None for rows that are no event of a probe."""
        if "electrode" not in self.by_name or self.name == "electrodes":
            return None
        return "start" if "start" in self.by_name else "at"


NOTE = Text("note", "anything else worth keeping")
BY = Text("by", "who did it")
AT = Moment("at", "when, ISO 8601 with an offset", required=True)
PROBE = Link("electrode", "label of the probe", required=True, to="electrodes")


def length(required: bool = False) -> Number:
    return Number(
        "exposed_length_um", "exposed length of the carbon", required, unit=units.LENGTH_UM, above=0, most=1e5
    )


def minutes(required: bool = False) -> Number:
    return Number("duration_min", "how long", required, unit=units.MINUTES, above=0, most=5e6)


def current(name: str, about: str, least: float | None = None) -> Number:
    return Number(name, about, unit=units.CURRENT_NA, least=least)


def potential(name: str, about: str) -> Number:
    return Number(name, about, unit=units.POTENTIAL_V, least=-10, most=10)
