"""Tables for a person: they fit the width there is, and meaning is never carried by colour."""

from __future__ import annotations

import re
from collections.abc import Iterable, Sequence
from datetime import datetime
from typing import TYPE_CHECKING

from electrolog.clock import shown_moment
from electrolog.show.text import one_line, safe, width
from electrolog.units import shown_number

if TYPE_CHECKING:
    from rich.table import Table

_TIE = "\ue000"  # of Unicode's private area: no text of the record is to lose a sign of its own
_BEFORE_UNIT = re.compile(r"(?<=\d) (?=±)|(?<=±) |(?<=\d) (?=(?:%|h|min|[nµm]M|µM|nA|mV|V|°C|days)(?![\w]))")


def print_table(
    columns: Sequence[str],
    rows: Iterable[Sequence[object]],
    numeric: Iterable[str] = (),
    least: Sequence[str] = (),
    wrapped: str = "",
    other_ways: str = ", --csv or --json",
) -> None:
    """Rows under their columns' names; cells are text and never markup: a note may hold brackets.

    `numeric` columns stand right. Where the width doesn't do, columns named in `least` are left out, the first
    one first, and it is said, with the `other_ways` of seeing them that the command has; only the column `wrapped`
    is broken into lines before that.
    """
    cells = [[one_line("" if cell is None else cell) for cell in row] for row in rows]
    kept, dropped = _fitting(columns, cells, least, wrapped)
    from rich import box
    from rich.table import Table
    from rich.text import Text

    right = set(numeric)
    table = Table(box=box.SIMPLE_HEAD, pad_edge=False, show_edge=False, expand=False)
    for place in kept:
        name = columns[place]
        table.add_column(Text(name), justify="right" if name in right else "left", overflow="fold")
    for row in cells:
        table.add_row(*[Text(row[place]) for place in kept])
    _print(table)
    if dropped:
        print_lines(f"(no room for: {', '.join(dropped)}; a wider terminal{other_ways} shows all)")


def _fitting(
    columns: Sequence[str], cells: Sequence[Sequence[str]], least: Sequence[str], wrapped: str
) -> tuple[list[int], list[str]]:
    """The places of the columns that fit side by side, and the names of those left out."""
    natural = [max([len(name), *(len(row[place]) for row in cells)]) for place, name in enumerate(columns)]
    needed = [min(wide, 30) if name == wrapped else wide for wide, name in zip(natural, columns, strict=True)]
    kept, dropped = list(range(len(columns))), []
    for name in least:
        if sum(needed[place] + 3 for place in kept) <= width() + 3:
            break
        kept.remove(columns.index(name))
        dropped.append(name)
    return kept, dropped


def _print(table: Table) -> None:
    import io

    from rich.console import Console

    # Drawn into a text first: rich would end the program by itself where the reader has gone (`| head`).
    drawn = io.StringIO()
    Console(file=drawn, width=width(), color_system=None, highlight=False, markup=False, emoji=False).print(table)
    print("\n".join(line.rstrip() for line in drawn.getvalue().splitlines()))  # noqa: T201


def print_lines(*lines: str) -> None:
    """Sentences, wrapped at the width there is; a number keeps its unit beside it."""
    import textwrap

    for line in lines:
        indent = " " * (len(line) - len(line.lstrip()))
        tied = _BEFORE_UNIT.sub(_TIE, safe(line))
        wrapped = textwrap.wrap(tied, width(), subsequent_indent=indent + "  ", break_on_hyphens=False)
        print("\n".join(wrapped).replace(_TIE, " ") if wrapped else "")  # noqa: T201


def with_error(value: float | None, error: float | None) -> str:
    """`10.00 ± 0.27`: the error to two digits and the value to the last of them, as the GUM asks (JCGM 100, 7.2.6).

    Without an error the value alone says less, and is marked so.
    """
    if value is None:
        return "?"
    if error is None:
        return f"{shown_number(value)} ± ?"
    if not (1e-6 <= error < 1e6 and abs(value) < 1e6):
        return f"{shown_number(value)} ± {shown_number(error, 2)}"
    decimals = 1 - int(f"{error:.1e}".partition("e")[2])
    return " ± ".join(f"{round(one, decimals):.{max(0, decimals)}f}" for one in (value, error))


def day_or_never(moment: datetime | None) -> str:
    return "never" if moment is None else shown_moment(moment)[:10]


def named(labels: Sequence[str], most: int = 12) -> str:
    """`P1, P2 and 7 more`."""
    rest = len(labels) - most
    return ", ".join(labels[:most]) + (f" and {rest} more" if rest > 0 else "")
