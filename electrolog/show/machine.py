"""Answers for programs: JSON and CSV on plain standard output, never through a console that would wrap them."""

from __future__ import annotations

import csv
import io
import json
import math
import re
import sys
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import asdict, is_dataclass
from datetime import date, datetime
from typing import Any

from electrolog.clock import iso_utc


def print_json(answer: Any) -> None:
    """One document. ASCII with escapes: the same bytes whatever encoding the stream has."""
    sys.stdout.write(json.dumps(plain(answer), ensure_ascii=True, allow_nan=False, indent=2) + "\n")


def plain(value: Any) -> Any:
    """Dataclasses, moments and numbers as JSON knows them; NaN and infinity, which it doesn't, as null."""
    if is_dataclass(value) and not isinstance(value, type):
        return plain(asdict(value))
    if isinstance(value, Mapping):
        return {str(key): plain(item) for key, item in value.items()}
    if isinstance(value, Iterable) and not isinstance(value, str):
        return [plain(item) for item in value]
    return _plain_scalar(value)


def _plain_scalar(value: Any) -> Any:
    if isinstance(value, str | bool | int) or value is None:
        return value
    if isinstance(value, date):
        return iso_utc(value) if isinstance(value, datetime) else value.isoformat()
    number = float(value)
    return number if math.isfinite(number) else None


def print_csv(rows: Sequence[Mapping[str, Any]], columns: Sequence[str] | None = None) -> None:
    """RFC 4180 in UTF-8; nested values as JSON in their cell."""
    flat = [{name: _cell(value) for name, value in plain(row).items()} for row in rows]
    names = list(columns or dict.fromkeys(name for row in flat for name in row))
    text = io.StringIO(newline="")
    writer = csv.DictWriter(text, names, extrasaction="ignore")
    writer.writeheader()
    writer.writerows(flat)
    sys.stdout.flush()
    sys.stdout.buffer.write(text.getvalue().encode())
    sys.stdout.buffer.flush()


def _cell(value: Any) -> Any:
    if isinstance(value, dict | list):
        return json.dumps(value, ensure_ascii=False) if value else ""
    if isinstance(value, float):
        return repr(value).removesuffix(".0")
    # A spreadsheet would run a cell that begins like a formula; the apostrophe keeps it text.
    return f"'{value}" if isinstance(value, str) and _FORMULA.match(value) else value


_FORMULA = re.compile(r"[=+@\t\r]|-(?![\d.]+( +-?[\d.]+)*$)")  # `-0.4 1.3 -0.4` are potentials
