"""Strikethrough, fill colour and comments of an .xlsx book: reported, never taken for a meaning."""

from __future__ import annotations

import io
from collections.abc import Mapping
from typing import Any

from electrolog.record.books.grid import Marks, Spot

_NO_FILL = {"", "00000000", "FFFFFFFF", "00FFFFFF"}


def marks_of(content: bytes) -> Mapping[str, Mapping[Spot, Marks]]:
    """The marks of every sheet's filled cells; none where the book's styles can't be read."""
    import warnings

    import openpyxl

    with warnings.catch_warnings():
        warnings.simplefilter("ignore")  # about what it will not keep when it saves, which it never does here
        try:
            book = openpyxl.load_workbook(io.BytesIO(content), data_only=True)
        except (KeyError, ValueError, TypeError, AttributeError):
            return {}
    return {sheet.title: _sheet_marks(sheet) for sheet in book.worksheets}


def _sheet_marks(sheet: Any) -> dict[Spot, Marks]:
    found = {}
    for row in sheet.iter_rows():
        for cell in row:
            marks = _cell_marks(cell)
            if marks != Marks():
                found[cell.row - 1, cell.column - 1] = marks
    return found


def _cell_marks(cell: Any) -> Marks:
    comment = getattr(cell, "comment", None)
    said = " ".join(str(comment.text).split()) if comment else ""
    if not cell.has_style or cell.value is None:
        return Marks(comment=said)
    return Marks(bool(cell.font and cell.font.strike), _colour(cell.fill), said)


def _colour(fill: Any) -> str:
    if fill is None or fill.fill_type != "solid":
        return ""
    colour = fill.fgColor
    if colour.type == "rgb":
        return "" if str(colour.rgb) in _NO_FILL else str(colour.rgb)[-6:]
    return f"{colour.type} {colour.theme if colour.type == 'theme' else colour.indexed}"
