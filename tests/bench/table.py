"""The table as it is read, and the same as JSON, with the machine and the versions that it was measured on."""

from __future__ import annotations

import importlib.metadata
import json
import os
import platform
import shutil
import sqlite3
import subprocess
from collections.abc import Sequence
from pathlib import Path
from typing import Any

from tests.bench.line import Line
from tests.bench.timing import Taken

LIBRARIES = ("numpy", "scipy", "pandas", "sqlalchemy", "typer", "statsmodels", "h5py")
HEADINGS = ("work", "against", "ours", "peer", "result", "by processor time", "aim", "verdict")


def machine() -> dict[str, Any]:
    return {
        "system": platform.platform(),
        "processor": _processor(),
        "cores": os.cpu_count(),
        "load": [round(load, 1) for load in os.getloadavg()] if hasattr(os, "getloadavg") else "unknown",
        "python": platform.python_version(),
        "sqlite": sqlite3.sqlite_version,
        "r": _r(),
        **{name: importlib.metadata.version(name) for name in LIBRARIES},
    }


def _processor() -> str:
    try:
        said = Path("/proc/cpuinfo").read_text(encoding="utf-8")
    except OSError:
        return platform.processor() or "unknown"
    names = [line.partition(":")[2].strip() for line in said.splitlines() if line.startswith("model name")]
    return names[0] if names else platform.processor() or "unknown"


def _r() -> str:
    if shutil.which("Rscript") is None:
        return "not there"
    asked = "cat(R.version$major, '.', R.version$minor, ', lme4 ', as.character(packageVersion('lme4')), sep='')"
    done = subprocess.run(["Rscript", "-e", asked], check=False, capture_output=True, encoding="utf-8")
    return done.stdout.strip() if done.returncode == 0 else "there, but without lme4"


def heading(about: dict[str, Any]) -> str:
    return "\n".join(f"{name:>12}: {said}" for name, said in about.items())


def row_of(line: Line) -> tuple[str, ...]:
    return (
        line.work,
        line.against or "–",
        _seconds(line.ours),
        _seconds(line.peer),
        _result(line.value, line.aim.unit),
        _result(line.by_processor_time, "×"),
        str(line.aim),
        line.verdict + (f": {line.note}" if line.note else ""),
    )


def markdown(lines: Sequence[Line]) -> str:
    rows = [HEADINGS, *map(row_of, lines)]
    widths = [max(len(row[place]) for row in rows) for place in range(len(HEADINGS) - 1)]
    padded = [[cell.ljust(width) for cell, width in zip(row, [*widths, 0], strict=True)] for row in rows]
    padded.insert(1, ["-" * width for width in [*widths, 7]])
    return "\n".join("| " + " | ".join(row) + " |" for row in padded)


def write_json(path: Path, about: dict[str, Any], lines: Sequence[Line]) -> None:
    path.parent.mkdir(parents=True, exist_ok=True)
    body = {"machine": about, "lines": [_plain(line) for line in lines]}
    path.write_text(json.dumps(body, indent=1, ensure_ascii=False) + "\n", encoding="utf-8")


def _plain(line: Line) -> dict[str, Any]:
    return {
        "work": line.work,
        "against": line.against,
        "ours_s": line.ours.seconds if line.ours else None,
        "peer_s": line.peer.seconds if line.peer else None,
        "ours_processor_s": line.ours.processor_s if line.ours else None,
        "peer_processor_s": line.peer.processor_s if line.peer else None,
        "by_processor_time": line.by_processor_time,
        "value": line.value,
        "unit": line.aim.unit,
        "aim": str(line.aim),
        "verdict": line.verdict,
        "note": line.note,
    }


def _result(value: float | None, unit: str) -> str:
    return "–" if value is None else f"{value:.3g}{unit if unit == '×' else ''}"


def _seconds(taken: Taken | None) -> str:
    if taken is None:
        return "–"
    middle = taken.median_s
    return f"{middle * 1000:.0f} ms" if middle < 1 else f"{middle:.3g} s"
