"""An empty book for those who stay in a spreadsheet: adopt reads it without a question."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from datetime import date
from pathlib import Path
from typing import TYPE_CHECKING, Any

from electrolog.errors import InputError
from electrolog.record.books.vocabulary import vocabulary
from electrolog.record.store import Record
from electrolog.units import shown_concentration

if TYPE_CHECKING:
    from openpyxl.worksheet.worksheet import Worksheet

ROWS = 500  # with rules for what may be typed
USUAL_UM = (0.0, 0.25, 0.5, 1.0, 2.0)


@dataclass(frozen=True)
class Rule:
    """A heading and what its cells take: a list's name, 'date', 'time', 'number', 'positive' or anything."""

    heading: str
    takes: str = ""
    about: str = ""


RUNS = (
    Rule("Probe", about="its label"),
    Rule("Date", "date"),
    Rule("Time", "time", "when the run began"),
    Rule("Duration (min)", "positive"),
    Rule("Setting", "setting"),
    Rule("Waveform", "waveform"),
    Rule("Subject", about="your own code, never a name"),
    Rule("Recording"),
    Rule("By"),
    Rule("Notes"),
)


def calibration_rules(concentrations_um: Sequence[float]) -> tuple[Rule, ...]:
    return (
        Rule("Probe", about="its label"),
        Rule("Date", "date"),
        Rule("Time", "time"),
        Rule("Stage", "stage", "relative to the run"),
        Rule("Analyte", "analyte"),
        Rule("Waveform", "waveform"),
        Rule("Buffer", "medium"),
        Rule("Temperature (°C)", "number"),
        Rule("Rig"),
        Rule("By"),
        *(Rule(f"{shown_concentration(value, 6)} (nA)", "number") for value in concentrations_um),
        Rule("Sensitivity (nA/µM)", "number", "only where no points were kept"),
        Rule("SE (nA/µM)", "positive"),
        Rule("Noise (nA)", "positive"),
        Rule("Notes"),
    )


def write_template(record: Record, path: Path, concentrations_um: Sequence[float] = USUAL_UM) -> None:
    """Raises InputError where a file is there already: it may be the one that is filled in."""
    if path.suffix.lower() != ".xlsx":
        raise InputError(f"{path.name}: a template is an .xlsx book; accepted: a name that ends so")
    if path.exists():
        raise InputError(f"{path}: is there already; accepted: a new name")
    try:
        import openpyxl
    except ModuleNotFoundError:
        hint = "install it with: python -m pip install python-calamine openpyxl"
        raise InputError("a template needs a library that is not installed", hint) from None
    book = openpyxl.Workbook()
    lists = _lists(record)
    _fill(book.create_sheet("Calibrations"), calibration_rules(concentrations_um), lists)
    _fill(book.create_sheet("Runs"), RUNS, lists)
    _fill_words(book.create_sheet("Words"), lists)
    del book["Sheet"]
    try:
        book.save(path)
    except OSError as why:
        raise InputError(f"{path}: can't be written: {why.strerror}; accepted: a place that may be written") from None


def _lists(record: Record) -> dict[str, list[str]]:
    with record.reading() as connection:
        known = vocabulary(connection)
    return {
        "stage": ["pre", "interim", "post"],
        "analyte": sorted(set(known.analytes.values())),
        "waveform": list(known.waveforms.values()),
        "medium": list(known.media.values()),
        "setting": list(known.settings.values()),
    }


def _fill(sheet: Worksheet, rules: Sequence[Rule], lists: dict[str, list[str]]) -> None:
    from openpyxl.comments import Comment
    from openpyxl.styles import Font
    from openpyxl.utils import get_column_letter

    sheet.freeze_panes = "B2"
    for place, rule in enumerate(rules, start=1):
        cell = sheet.cell(1, place, rule.heading)
        cell.font = Font(bold=True)
        letter = get_column_letter(place)
        sheet.column_dimensions[letter].width = max(12, len(rule.heading) + 2)
        if rule.about:
            cell.comment = Comment(rule.about, "electrolog")
        validation = _validation(rule, lists)
        if validation is not None:
            validation.add(f"{letter}2:{letter}{ROWS + 1}")
            sheet.add_data_validation(validation)
        for (row,) in sheet.iter_rows(2, ROWS + 1, place, place) if rule.takes in ("date", "time") else ():
            row.number_format = "yyyy-mm-dd" if rule.takes == "date" else "hh:mm"


def _validation(rule: Rule, lists: dict[str, list[str]]) -> Any:
    from openpyxl.utils import get_column_letter
    from openpyxl.worksheet.datavalidation import DataValidation

    bounds: dict[str, tuple[Any, Any, Any]] = {
        "date": ("date", "greaterThan", (date(1970, 1, 1) - date(1899, 12, 30)).days),
        "time": ("time", "between", 0),
        "number": ("decimal", "between", -1e60),
        "positive": ("decimal", "greaterThan", 0),
    }
    upper = {"time": 0.999989, "number": 1e60}
    if rule.takes in lists:
        column = get_column_letter(list(lists).index(rule.takes) + 1)
        span = f"Words!${column}$2:${column}${len(lists[rule.takes]) + 1}"
        found = DataValidation(type="list", formula1=span, allow_blank=True)
    elif rule.takes:
        kind, operator, bound = bounds[rule.takes]
        found = DataValidation(type=kind, operator=operator, formula1=bound, formula2=upper.get(rule.takes))
    else:
        return None
    found.error, found.errorTitle, found.showErrorMessage = f"{rule.heading}: {_accepted(rule)}", "electrolog", True
    return found


def _accepted(rule: Rule) -> str:
    said = {"date": "a date", "time": "a time such as 09:30", "positive": "a number above 0"}
    return said.get(rule.takes, "a number" if rule.takes == "number" else "a word of the sheet Words")


def _fill_words(sheet: Worksheet, lists: dict[str, list[str]]) -> None:
    for place, (name, words) in enumerate(lists.items(), start=1):
        for row, word in enumerate([name, *words], start=1):
            cell = sheet.cell(row, place, word)
            cell.data_type = "s"  # a word that begins with = stays a word
