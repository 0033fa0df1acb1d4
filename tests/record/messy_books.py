"""Books as labs keep them, invented and unlike each other, each with what a careful person reads in it."""

from __future__ import annotations

import csv
from collections.abc import Callable
from dataclasses import dataclass, field
from datetime import date, datetime
from pathlib import Path
from typing import Any

import openpyxl
import xlwt
from odf.opendocument import OpenDocumentSpreadsheet
from odf.table import Table, TableCell, TableRow
from odf.text import P
from openpyxl.comments import Comment
from openpyxl.styles import Font, PatternFill

Truth = tuple[str, str, str, Any]  # probe, day, stage, and a factor in nA/µM or the points


@dataclass(frozen=True)
class MessyBook:
    name: str
    make: Callable[[Path], None]
    answers: dict[str, str]  # what a person has to say; nothing else is asked
    calibrations: list[Truth]
    runs: list[tuple[str, str, float, str | None]] = field(default_factory=list)  # probe, day, minutes, subject
    told: tuple[str, ...] = ()  # cells that must be named in a remark


def _save(path: Path, *sheets: tuple[str, list[list[Any]]]) -> openpyxl.Workbook:
    book = openpyxl.Workbook()
    book.remove(book.active)
    for name, rows in sheets:
        sheet = book.create_sheet(name)
        for row in rows:
            sheet.append(row)
    book.save(path)
    return book


def factor_list(path: Path) -> None:
    rows = [
        ["Calibrations 2023"],
        [],
        ["Probe", "Date", "Pre/Post", "Sens. (nA/uM)", "SE", "R2", "Buffer", "Notes", "Coating"],
        ["K-01", date(2023, 3, 4), "pre", 12.5, 0.3, 0.999, "PBS", "good", "PFSA"],
        ["K-01", date(2023, 3, 4), "post", 8.1, 0.3, 0.999, "PBS", None, None],
        [],
        ["K-02", "5 Mar 23", "Pre", "~9.1", None, 0.98, "my own mix", None, None],
        ["K-03", "13/3/2023", "before", "<LOD", None, None, None, None, None],
        ["Mean", None, None, "=AVERAGE(D4:D7)", None, None, None, None, None],
    ]
    book = _save(path, ("Cals", rows))
    sheet = book["Cals"]
    sheet["D4"].font = Font(strike=True)
    sheet["D5"].fill = PatternFill("solid", fgColor="FFFF00")
    sheet["E4"].comment = Comment("reference was old", "wren")
    book.save(path)


def pre_and_post_beside(path: Path) -> None:
    rows = [
        ["", "", "Pre", None, "Post", None, "", ""],
        ["Electrode #", "Animal", "Date", "nA/µM", "Date", "nA/µM", "Time in brain (h)", "Date"],
        ["E1", "R-70", date(2022, 5, 2), 10.0, date(2022, 5, 2), 6.0, 2.5, date(2022, 5, 2)],
        ["E2", "R-71", date(2022, 5, 3), 11.0, date(2022, 5, 4), "n/a", "90 min", date(2022, 5, 3)],
    ]
    book = _save(path, ("runs", rows))
    book["runs"].merge_cells("C1:D1")
    book["runs"].merge_cells("E1:F1")
    book.save(path)


def concentrations_across(path: Path) -> None:
    head = ["Probe ID", "Cal date", "Stage", 0.25, 0.5, 0.5, 1]
    rows = [
        ["", "", "", "[DA] (µM)", None, None, None],
        head,
        ["N07", date(2024, 1, 9), "pre", 3.1, 6.0, 6.2, 12.1],
        ["N08", date(2024, 1, 9), "pre", 2.0, "<LOD", 4.1, 8.2],
        [],
        head,
        ["N07", date(2024, 1, 11), "post", 1.5, 3.0, 3.2, 6.1],
    ]
    book = _save(path, ("flow cell", rows), ("Todo", [["order glass"], ["ask about pump"]]))
    book["flow cell"].merge_cells("D1:G1")
    book.save(path)


def blocks_stacked(path: Path) -> None:
    def block(probe: str, day: str, stage: str, currents: list[float]) -> list[list[Any]]:
        points = [[c, i] for c, i in zip((0, 0.5, 1, 2), currents, strict=True)]
        return [[f"Probe: {probe}"], ["Date:", day], ["Stage", stage], ["conc (uM)", "current (nA)"], *points, []]

    _save(
        path,
        (
            "Sheet1",
            [
                *block("C-1", "14.03.2021", "pre", [0.1, 5.0, 10.1, 20.0]),
                *block("C-1", "16.03.2021", "post", [0.1, 3.0, 6.1, 12.0]),
                *block("C-2", "17.03.2021", "pre", [0.0, 4.0, 8.1, 16.0]),
            ],
        ),
    )


def blocks_side_by_side(path: Path) -> None:
    book = OpenDocumentSpreadsheet()
    rows: list[list[Any]] = [
        ["Probe", "G1", "", "Probe", "G2"],
        ["Date", "2020-06-01", "", "Date", "2020-06-02"],
        ["[DA] nM", "pA", "", "[DA] nM", "pA"],
        [250.0, 2500.0, "", 250.0, 1500.0],
        [500.0, 5000.0, "", 500.0, 3000.0],
        [1000.0, 10000.0, "", 1000.0, 6000.0],
    ]
    table = Table(name="pairs")
    for row in rows:
        line = TableRow()
        for value in row:
            number = isinstance(value, float)
            cell = TableCell(valuetype="float", value=value) if number else TableCell(valuetype="string")
            cell.addElement(P(text=str(value)))
            line.addElement(cell)
        table.addElement(line)
    book.spreadsheet.addElement(table)
    book.save(str(path))


def sheet_per_animal(path: Path) -> None:
    book = xlwt.Workbook()
    for animal, rows in (
        ("rat 12", [("P1", "2019-02-03", 0.08, 0.1, 3), ("P2", "2019-02-03", 0.1, 0.2, 3)]),
        ("rat 13", [("P3", "2019-02-10", 0.125, 0.25, 1.5)]),
    ):
        sheet = book.add_sheet(animal)
        heads = ("CFE", "day", "Pre cal factor (µM/nA)", "Post cal factor (µM/nA)", "Exposure time (h)")
        for row, cells in enumerate([heads, *rows]):
            for column, value in enumerate(cells):
                sheet.write(row, column, value)
    book.save(str(path))


def semicolons(path: Path) -> None:
    text = (
        "Probe;Datum;Stage;Slope;Temp;Operator\r\n;;;nA/µM;°C;\r\n"
        "S-1;4.3.21;pre;12,5;37,0;finch\r\nS-1;5.3.21;post;1.012,25;37,0;finch\r\n;;;;;\r\nn;;;2;;\r\n"
    )
    path.write_bytes(text.encode("cp1252"))


def one_row_per_point(path: Path) -> None:
    rows = [
        ["electrode", "date", "pre/post", "concentration (uM)", "peak current (nA)", "operator"],
        ["L1", "2024-02-03", "pre", "0.5", "5.1", "wren"],
        ["", "", "", "1", "10.2", ""],
        ["", "", "", "2", "20.1", ""],
        ["", "", "post", "0.5", "4.0", ""],
        ["", "", "", "1", "8.1", ""],
        ["L2", "2024-02-04", "pre", "0.5", "6.0", "finch"],
        ["", "", "", "1", "12", ""],
    ]
    with path.open("w", encoding="utf-8", newline="") as stream:
        csv.writer(stream).writerows(rows)


def sheet_per_probe(path: Path) -> None:
    heads = ["When", "type", "sensitivity (pA/nM)", "± SE", "who"]
    _save(
        path,
        (
            "Q-1",
            [heads, [date(2025, 1, 2), "pre-cal", 9.5, 0.2, "wren"], [date(2025, 1, 5), "post-cal", 7.5, 0.2, "wren"]],
        ),
        ("Q-2", [heads, [date(2025, 1, 2), "pre-cal", 8.5, 0.1, "wren"]]),
    )


def headings_down(path: Path) -> None:
    _save(
        path,
        (
            "across",
            [
                ["Probe", "T-1", "T-2", "T-3"],
                ["Date", date(2023, 7, 1), date(2023, 7, 2), date(2023, 7, 3)],
                ["Stage", "pre", "pre", "post"],
                ["Sensitivity, nA/µM", 4.0, 5.0, 6.0],
            ],
        ),
    )


def ambiguous(path: Path) -> None:
    rows = ["Probe\tDate\tStage\tFactor\tComment", "A-1\t3/4/2024\tpre\t1,250\t=cmd()", "a1\t3/4/2024\tpost\t0.9\t"]
    path.write_text("\n".join(rows), encoding="utf-8")


def told_once_for_both(path: Path) -> None:
    rows = [
        ["Electrode", "Date", "Sensitivity (nA/µM)", None, "Run (h)"],
        [None, None, "Pre", "Post", None],
        [12, datetime(2023, 1, 2, 14, 30), 10.0, "7 nA/µM", 3],
        [13, datetime(2023, 1, 3, 9, 0), 11.5, "-", 2],
    ]
    book = _save(path, ("S", rows))
    for span in ("C1:D1", "A1:A2", "B1:B2", "E1:E2"):
        book["S"].merge_cells(span)
    book.save(path)


def units_below(path: Path) -> None:
    rows = [
        [None, "Lab book 4"],
        [],
        [None, "E. no.", "Date (dd/mm/yy)", "Slope", "Slope error", "Lot", "Pre or post"],
        [None, "units", None, "nA/uM", "nA/uM", None, None],
        [None, 7, "03/04/22", 10, 0.2, "L1", "pre-calibration"],
        [None, 8, "04/04/22", 11, 0.2, "L1", "after"],
    ]
    _save(path, ("S", rows))


def probes_across_by_concentration(path: Path) -> None:
    def block(day: str, stage: str, *rows: list[Any]) -> list[list[Any]]:
        return [["Date", day], ["Stage", stage], ["DA (µM)", "W-1", "W-2", "W-3"], *rows, []]

    rows = [
        ["Peak currents (nA)"],
        *block("2023-05-02", "pre", [0.5, 5.0, 6.0, 4.0], [1.0, 10.1, 12.2, None], [2.0, 20.0, 24.5, 16.2]),
        *block("2023-05-09", "post", [0.5, 4.0, None, 3.0], [1.0, 8.1, None, "<LOD"], [2.0, 16.0, None, 12.0]),
    ]
    _save(path, ("week 18", rows))


def probes_across_by_day(path: Path) -> None:
    rows = [
        ["Slopes, nA/µM, flow cell"],
        ["", "Electrode", None, None],
        ["Day", "M01", "M02", "m03"],
        ["3 May 22", 11.0, 9.5, None],
        ["10 May 22", 8.8, "n/a", 12.0],
        ["Mean", 9.9, 9.5, 12.0],
    ]
    book = _save(path, ("all", rows))
    book["all"].merge_cells("B2:D2")
    book.save(path)


def days_across(path: Path) -> None:
    rows = ["electrode;2024-01-08;2024-01-15;2024-01-22", "V1;12,5;10,1;9,7", "V2;11,0;;8,2"]
    path.write_text("\n".join(rows), encoding="utf-8")


def headings_in_two_rows(path: Path) -> None:
    heads = [
        ["Probe", "Calibration", None, None, "Who", "In brain", None, "Remarks"],
        ["#", "when", "factor (µM/nA)", "LOD (nM)", "operator", "from", "hrs", None],
    ]
    rows = [
        ["N-1", "3/4/24", "0,08", "21", "wren", None, None, "ok"],
        ["SD-2", "14/4/24", "~0,1", "<20", "finch", None, None, None],
        *heads,
        ["n 3", date(2024, 5, 2), 0.125, 25, "finch", None, None, None],
        ["Mean", None, 0.1, None, None, None, None, None],
        ["n", 3, None, None, None, None, None, None],
    ]
    book = _save(path, ("Log", [*heads, *rows]))
    for span in ("B1:D1", "F1:G1", "B5:D5"):
        book["Log"].merge_cells(span)
    book.save(path)


def headings_in_the_first_row_alone(path: Path) -> None:
    rows = [
        ["Probe", "Date", "Pre", None, "Operator"],
        [None, None, "nA/µM", "LOD (nM)", None],
        ["R-1", date(2024, 5, 2), 10.0, 20, "wren"],
        ["R-2", date(2024, 5, 3), 11.0, 20, "finch"],
    ]
    book = _save(path, ("A", rows))
    book["A"].merge_cells("C1:D1")
    book.save(path)


def probes_across_with_days_below(path: Path) -> None:
    rows = [
        ["Flow cell, spring"],
        ["", "Batch Q7", None, "Batch Q8"],
        ["[DA] (µM)", "Q7-01", "Q7-02", "Q8-1"],
        ["Date", "12.03.25", "13.03.25", date(2025, 3, 14)],
        ["Stage", "pre", "pre", "post"],
        ["0", "0,05", "<LOD", "0,1"],
        ["0,5", "6,2", "5,7", "4,4"],
        ["1", "12,3", "11,6", "8,8"],
        ["Mean (nA)", "9,27", "8,65", "6,6"],
    ]
    book = _save(path, ("spring", rows))
    book["spring"].merge_cells("B2:C2")
    book.save(path)


USUAL = {"waveform": "triangle"}
BOTH = {**USUAL, "analyte": "DA"}
BOOKS = [
    MessyBook(
        "factors.xlsx",
        factor_list,
        {**BOTH, "struck": "take", "coated": "before"},
        [("K-01", "2023-03-04", "pre", 12.5), ("K-01", "2023-03-04", "post", 8.1), ("K-02", "2023-03-05", "pre", 9.1)],
        told=("Cals!D4", "Cals!D5", "Cals!D7", "Cals!G7", "Cals!A8:I8", "Cals!A9"),
    ),
    MessyBook(
        "beside.xlsx",
        pre_and_post_beside,
        {**BOTH, "setting": "in-vivo"},
        [("E1", "2022-05-02", "pre", 10.0), ("E1", "2022-05-02", "post", 6.0), ("E2", "2022-05-03", "pre", 11.0)],
        [("E1", "2022-05-02", 150.0, "R-70"), ("E2", "2022-05-03", 90.0, "R-71")],
        told=("runs!F4",),
    ),
    MessyBook(
        "across.xlsx",
        concentrations_across,
        {**USUAL, "unit_current": "nA"},
        [
            ("N07", "2024-01-09", "pre", [(0.25, 3.1), (0.5, 6.0), (0.5, 6.2), (1.0, 12.1)]),
            ("N08", "2024-01-09", "pre", [(0.25, 2.0), (0.5, 4.1), (1.0, 8.2)]),
            ("N07", "2024-01-11", "post", [(0.25, 1.5), (0.5, 3.0), (0.5, 3.2), (1.0, 6.1)]),
        ],
        told=("flow cell!E4",),
    ),
    MessyBook(
        "stacked.xlsx",
        blocks_stacked,
        BOTH,
        [
            ("C-1", "2021-03-14", "pre", [(0.0, 0.1), (0.5, 5.0), (1.0, 10.1), (2.0, 20.0)]),
            ("C-1", "2021-03-16", "post", [(0.0, 0.1), (0.5, 3.0), (1.0, 6.1), (2.0, 12.0)]),
            ("C-2", "2021-03-17", "pre", [(0.0, 0.0), (0.5, 4.0), (1.0, 8.1), (2.0, 16.0)]),
        ],
    ),
    MessyBook(
        "pairs.ods",
        blocks_side_by_side,
        {**USUAL, "stage": "pre"},
        [
            ("G1", "2020-06-01", "pre", [(0.25, 2.5), (0.5, 5.0), (1.0, 10.0)]),
            ("G2", "2020-06-02", "pre", [(0.25, 1.5), (0.5, 3.0), (1.0, 6.0)]),
        ],
    ),
    MessyBook(
        "animals.xls",
        sheet_per_animal,
        {**BOTH, "setting": "in-vivo", "sheet_name": "subject"},
        [
            ("P1", "2019-02-03", "pre", 12.5),
            ("P1", "2019-02-03", "post", 10.0),
            ("P2", "2019-02-03", "pre", 10.0),
            ("P2", "2019-02-03", "post", 5.0),
            ("P3", "2019-02-10", "pre", 8.0),
            ("P3", "2019-02-10", "post", 4.0),
        ],
        [
            ("P1", "2019-02-03", 180.0, "rat 12"),
            ("P2", "2019-02-03", 180.0, "rat 12"),
            ("P3", "2019-02-10", 90.0, "rat 13"),
        ],
    ),
    MessyBook(
        "semicolons.csv",
        semicolons,
        BOTH,
        [("S-1", "2021-03-04", "pre", 12.5), ("S-1", "2021-03-05", "post", 1012.25)],
        told=("semicolons!A6", "semicolons!B3"),
    ),
    MessyBook(
        "points.csv",
        one_row_per_point,
        BOTH,
        [
            ("L1", "2024-02-03", "pre", [(0.5, 5.1), (1.0, 10.2), (2.0, 20.1)]),
            ("L1", "2024-02-03", "post", [(0.5, 4.0), (1.0, 8.1)]),
            ("L2", "2024-02-04", "pre", [(0.5, 6.0), (1.0, 12.0)]),
        ],
    ),
    MessyBook(
        "probes.xlsx",
        sheet_per_probe,
        {**BOTH, "sheet_name": "probe"},
        [("Q-1", "2025-01-02", "pre", 9.5), ("Q-1", "2025-01-05", "post", 7.5), ("Q-2", "2025-01-02", "pre", 8.5)],
    ),
    MessyBook(
        "down.xlsx",
        headings_down,
        BOTH,
        [("T-1", "2023-07-01", "pre", 4.0), ("T-2", "2023-07-02", "pre", 5.0), ("T-3", "2023-07-03", "post", 6.0)],
    ),
    MessyBook(
        "ambiguous.tsv",
        ambiguous,
        {**BOTH, "date_order": "mdy", "decimal_mark": ",", "unit_sensitivity": "uM/nA", "same:a1": "A-1"},
        [("A-1", "2024-03-04", "pre", 0.8), ("A-1", "2024-03-04", "post", 1 / 0.9)],
    ),
    MessyBook(
        "once.xlsx",
        told_once_for_both,
        {**BOTH, "setting": "slice"},
        [("12", "2023-01-02", "pre", 10.0), ("12", "2023-01-02", "post", 7.0), ("13", "2023-01-03", "pre", 11.5)],
        [("12", "2023-01-02", 180.0, None), ("13", "2023-01-03", 120.0, None)],
        told=("S!D4",),
    ),
    MessyBook(
        "units.xlsx",
        units_below,
        BOTH,
        [("7", "2022-04-03", "pre", 10.0), ("8", "2022-04-04", "post", 11.0)],
        told=("S!C5", "S!C6"),
    ),
    MessyBook(
        "matrix.xlsx",
        probes_across_by_concentration,
        {**USUAL, "probe_columns": "probes"},
        [
            ("W-1", "2023-05-02", "pre", [(0.5, 5.0), (1.0, 10.1), (2.0, 20.0)]),
            ("W-2", "2023-05-02", "pre", [(0.5, 6.0), (1.0, 12.2), (2.0, 24.5)]),
            ("W-3", "2023-05-02", "pre", [(0.5, 4.0), (2.0, 16.2)]),
            ("W-1", "2023-05-09", "post", [(0.5, 4.0), (1.0, 8.1), (2.0, 16.0)]),
            ("W-3", "2023-05-09", "post", [(0.5, 3.0), (2.0, 12.0)]),
        ],
        told=("week 18!D13",),
    ),
    MessyBook(
        "slopes.xlsx",
        probes_across_by_day,
        {**BOTH, "stage": "interim", "unit_sensitivity": "nA/uM"},
        [
            ("M01", "2022-05-03", "interim", 11.0),
            ("M01", "2022-05-10", "interim", 8.8),
            ("M02", "2022-05-03", "interim", 9.5),
            ("m03", "2022-05-10", "interim", 12.0),
        ],
        told=("all!A6", "all!C5"),
    ),
    MessyBook(
        "days.csv",
        days_across,
        {**BOTH, "stage": "pre", "unit_sensitivity": "nA/uM"},
        [
            ("V1", "2024-01-08", "pre", 12.5),
            ("V1", "2024-01-15", "pre", 10.1),
            ("V1", "2024-01-22", "pre", 9.7),
            ("V2", "2024-01-08", "pre", 11.0),
            ("V2", "2024-01-22", "pre", 8.2),
        ],
    ),
    MessyBook(
        "two_rows.xlsx",
        headings_in_two_rows,
        {**BOTH, "stage": "pre"},
        [("N-1", "2024-04-03", "pre", 12.5), ("SD-2", "2024-04-14", "pre", 10.0), ("n 3", "2024-05-02", "pre", 8.0)],
        told=("Log!C4", "Log!A8", "Log!A9"),
    ),
    MessyBook(
        "first_row.xlsx",
        headings_in_the_first_row_alone,
        BOTH,
        [("R-1", "2024-05-02", "pre", 10.0), ("R-2", "2024-05-03", "pre", 11.0)],
    ),
    MessyBook(
        "days_below.xlsx",
        probes_across_with_days_below,
        {**USUAL, "probe_columns": "probes", "unit_current": "nA"},
        [
            ("Q7-01", "2025-03-12", "pre", [(0.0, 0.05), (0.5, 6.2), (1.0, 12.3)]),
            ("Q7-02", "2025-03-13", "pre", [(0.5, 5.7), (1.0, 11.6)]),
            ("Q8-1", "2025-03-14", "post", [(0.0, 0.1), (0.5, 4.4), (1.0, 8.8)]),
        ],
        told=("spring!C6", "spring!A9"),
    ),
]
