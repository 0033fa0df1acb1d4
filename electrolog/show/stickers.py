"""Sheets of stickers for storage boxes: a QR code that says a probe's label and nothing else, the label under it."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING, Any

from electrolog.errors import InputError
from electrolog.show.figures import figure, figures_of_pages
from electrolog.show.text import one_line

if TYPE_CHECKING:
    from matplotlib.figure import Figure

PAPERS_MM = {"a4": (210.0, 297.0), "letter": (215.9, 279.4)}
_MM_PER_INCH = 25.4
_POINT_MM = _MM_PER_INCH / 72


@dataclass(frozen=True)
class Sheet:
    """A grid of square stickers with text under each, in millimetres."""

    paper: str = "a4"
    code_mm: float = 18.0
    text_mm: float = 5.0
    gap_mm: float = 5.0
    margin_mm: float = 10.0

    def __post_init__(self) -> None:
        if self.paper not in PAPERS_MM:
            raise InputError(f"paper: no '{self.paper}'; accepted: {', '.join(PAPERS_MM)}")
        if not 8 <= self.code_mm <= 60:
            raise InputError(f"size: {self.code_mm:g} mm is out of range; accepted: 8 to 60 mm")

    @property
    def size_mm(self) -> tuple[float, float]:
        return PAPERS_MM[self.paper]

    @property
    def columns(self) -> int:
        return int((self.size_mm[0] - 2 * self.margin_mm + self.gap_mm) // (self.code_mm + self.gap_mm))

    @property
    def rows(self) -> int:
        return int((self.size_mm[1] - 2 * self.margin_mm + self.gap_mm) // (self.code_mm + self.text_mm + self.gap_mm))

    def corner_mm(self, place: int) -> tuple[float, float]:
        """Left and top of a sticker, from the paper's left and top."""
        row, column = divmod(place, self.columns)
        left = self.margin_mm + column * (self.code_mm + self.gap_mm)
        return left, self.margin_mm + row * (self.code_mm + self.text_mm + self.gap_mm)


def write_stickers(path: Path, labels: Sequence[str], sheet: Sheet) -> int:
    """Returns how many pages it took. Raises InputError for more than one where the kind of file holds only one."""
    size = sheet.columns * sheet.rows
    pages = [labels[start : start + size] for start in range(0, len(labels), size)]
    inches = tuple(side / _MM_PER_INCH for side in sheet.size_mm)
    if len(pages) == 1:
        with figure(path, inches[0], inches[1]) as paper:
            _draw(paper, pages[0], sheet)
    elif path.suffix.casefold() == ".pdf":
        with figures_of_pages(path, inches[0], inches[1]) as add_page:
            for page in pages:
                _draw(add_page(), page, sheet)
    else:
        raise InputError(f"{len(labels)} stickers take {len(pages)} pages; accepted: up to {size} here, or a .pdf")
    return len(pages)


def _draw(paper: Figure, labels: Sequence[str], sheet: Sheet) -> None:
    for place, label in enumerate(labels):
        _draw_one(paper, label, sheet.corner_mm(place), sheet)


def _draw_one(paper: Figure, label: str, corner_mm: tuple[float, float], sheet: Sheet) -> None:
    import numpy as np
    import segno

    # A hand scanner reads plain QR codes; the quiet zone of 4 modules is part of the code (ISO/IEC 18004).
    code = segno.make(label, micro=False, error="m", boost_error=True)
    modules = np.array([list(row) for row in code.matrix_iter(scale=1, border=4)], dtype=bool)
    wide, high = sheet.size_mm
    left, top = corner_mm
    edges = np.linspace(0.0, sheet.code_mm, len(modules) + 1)
    dark: list[Any] = []
    for row, column in zip(*np.nonzero(modules), strict=True):
        x, y = left + edges[column], high - top - edges[row + 1]
        dark.append([(x, y), (x + edges[1], y), (x + edges[1], y + edges[1]), (x, y + edges[1])])
    paper.add_artist(_squares(dark, wide, high))
    size = min(8.0, 1.6 * sheet.code_mm / _POINT_MM / max(len(label), 1))
    text_at = ((left + sheet.code_mm / 2) / wide, 1 - (top + sheet.code_mm + 1.0) / high)
    paper.text(*text_at, one_line(label), fontsize=max(size, 2.5), ha="center", va="top", family="monospace")


def _squares(corners_mm: Sequence[Any], wide_mm: float, high_mm: float) -> Any:
    from matplotlib.collections import PolyCollection

    scaled = [[(x / wide_mm, y / high_mm) for x, y in corners] for corners in corners_mm]
    # Without an edge of its own colour a hairline of white shows between the modules.
    return PolyCollection(scaled, facecolor="black", edgecolor="black", linewidth=0.1)
