"""Files that every reader takes, to be spoilt: each small, right, and with the words that read it."""

from __future__ import annotations

import io
from dataclasses import dataclass

import numpy as np


@dataclass(frozen=True)
class File:
    name: str
    content: bytes
    words: list[str]


_EXCHANGE = {
    "electrodes.csv": "electrode,batch,geometry,exposed_length_um\nX1,,cylinder,100\nX2,,disk,\n",
    "waveforms.csv": "waveform,vertices_v,scan_rate_v_s,frequency_hz\nzigzag,-0.4 1.3 -0.4,400,10\n",
    "calibrations.csv": (
        "calibration,electrode,at,stage,analyte,waveform,noise_na\nXC1,X1,2026-01-07T09:00:00Z,pre,dopamine,zigzag,0.08\n"
    ),
    "calibration_points.csv": "calibration,concentration_um,current_na\nXC1,0,0.1\nXC1,1,12.2\nXC1,2,24\n",
    "exposures.csv": "electrode,start,duration_min,setting\nX1,2026-01-08T09:00:00Z,240,in-vivo\n",
    "terms.csv": "kind,term,meaning\nsetting,gel,agar\n",
    "standards.csv": "standard,analyte,prepared_at,concentration_um\nXS,dopamine,2026-01-07T08:00:00Z,10000\n",
}
EXCHANGE = {name: text.encode() for name, text in _EXCHANGE.items()}
CALIBRATING = ["B1-02", "pre", "DA"]
ANSWERS = ["--answer", "waveform=triangle", "--answer", "analyte=DA", "--answer", "date_order=dmy", "--commit"]
BOOK = 'probe,date,stage,nA/uM,note\nK1,2024-03-04,pre,12,ok\nK2,05/03/2024,post,"9,5",tip bent\n'
PLAN = (
    "label,start,duration,analyte,waveform,setting,needs,project\nMon,2035-02-02T09:00Z,2h,DA,triangle,in-vivo,50nM,\n"
)
MAPPING = """[answers]
waveform = "triangle"
analyte = "DA"

[times]
pre = "09:00"

[spellings]
"K1" = "K1"

[headings]
"nA/uM" = {field = "sensitivity", unit = "nA/uM"}

[sheets]
skip = ["Notes"]
"""


def readers() -> dict[str, File]:
    take = ["1uM", "-w", "triangle", "--yes"]
    time, current = np.arange(0, 200, 0.5), np.zeros(400)
    current[120:200] = 12.0
    trace = np.column_stack([time, current + 0.05 * np.sin(7 * time)])
    potential = np.concatenate([np.linspace(-0.4, 1.3, 12, endpoint=False), np.linspace(1.3, -0.4, 12)])
    scans = 100 + 50 * potential + (current[::2, None] * np.exp(-(((potential - 0.6) / 0.2) ** 2)))
    return {
        "trace.csv": File("a.csv", _csv("time_s,current_na", trace), ["trace", *CALIBRATING, "a.csv", *take]),
        "trace.npy": File("a.npy", _npy(trace), ["trace", *CALIBRATING, "a.npy", *take]),
        "trace.h5": File("a.h5", _h5(time_s=time, current_na=trace[:, 1]), ["trace", *CALIBRATING, "a.h5", *take]),
        "scans.csv": File(
            "b.csv",
            _csv(",".join(["time_s", *(f"{v:.4f}" for v in potential)]), np.column_stack([time[::2] * 1.0, scans])),
            ["scans", *CALIBRATING, "b.csv", *take],
        ),
        "recording": File(
            "a.csv", _csv("time_s,current_na", trace), ["convert", "a.csv", "-p", "B1-01", "-a", "DA", "-w", "triangle"]
        ),
        "spreadsheet.csv": File("book.csv", BOOK.encode(), ["adopt", "book.csv", *ANSWERS]),
        "spreadsheet.xlsx": File("book.xlsx", _xlsx(), ["adopt", "book.xlsx", *ANSWERS]),
        "mapping": File("mine.toml", MAPPING.encode(), ["adopt", "right.csv", "--mapping", "mine.toml", *ANSWERS]),
        "settings": File("settings.toml", b'rig = "north"\nby = "wren"\nzone = "UTC"\n', ["inspect", "B1-01", "--yes"]),
        "plan": File("plan.csv", PLAN.encode(), ["assign", "plan.csv"]),
        "points": File(
            "points.csv",
            b"concentration_um,current_na\n0,0.1\n1,12.2\n2,24\n",
            ["calibrate", *CALIBRATING, "--points", "points.csv", "-w", "triangle", "--yes"],
        ),
    }


def _csv(heading: str, rows: np.ndarray) -> bytes:
    return (heading + "\n" + "".join(",".join(f"{cell:.5g}" for cell in row) + "\n" for row in rows)).encode()


def _npy(rows: np.ndarray) -> bytes:
    file = io.BytesIO()
    np.save(file, rows)
    return file.getvalue()


def _h5(**columns: np.ndarray) -> bytes:
    import h5py

    file = io.BytesIO()
    with h5py.File(file, "w") as whole:
        for name, column in columns.items():
            whole[name] = column
    return file.getvalue()


def _xlsx() -> bytes:
    import openpyxl

    book, file = openpyxl.Workbook(), io.BytesIO()
    for line in BOOK.replace('"9,5"', "9.5").splitlines():
        book.active.append(line.split(","))
    book.save(file)
    return file.getvalue()
