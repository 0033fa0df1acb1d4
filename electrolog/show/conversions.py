"""A converted recording: the file it is written to, and what is said of it."""

from __future__ import annotations

import json
import math
from pathlib import Path
from typing import Any

from electrolog.answers.converting import Converted, FixedFactor, Spread
from electrolog.errors import InputError
from electrolog.show.machine import plain, print_json
from electrolog.show.tables import print_lines
from electrolog.units import shown_number

COLUMNS = ("time_s", "current_na", "concentration_um", "low_um", "high_um")


def targets(recording: Path, out: Path | None) -> tuple[Path, Path]:
    """The result and what it rests on, beside it. Raises InputError where something stands there already."""
    result = out or recording.with_name(f"{recording.stem}.concentration.csv")
    account = result.with_suffix(".json")
    for path in (result, account):
        if path.exists():
            raise InputError(f"{path.name} is there already, and nothing is overwritten", "name another with --out")
    return result, account


def write(found: Converted, result: Path, account: Path) -> None:
    arrays = (found.time_s, found.current_na, found.concentration_um, found.low_um, found.high_um)
    with result.open("w", encoding="utf-8", newline="") as file:
        file.write(",".join(COLUMNS) + "\n")
        for row in zip(*(array.tolist() for array in arrays), strict=True):
            file.write(",".join("" if math.isnan(value) else f"{value:.9g}" for value in row) + "\n")
    text = json.dumps(plain({**found.account, "result": result.name}), ensure_ascii=True, allow_nan=False, indent=2)
    account.write_text(text + "\n", encoding="utf-8")


def answer(found: Converted, result: Path, account: Path, as_json: bool) -> None:
    if as_json:
        print_json(as_dict(found, result, account))
    else:
        print_lines(*sentences(found, result, account))


def as_dict(found: Converted, result: Path, account: Path) -> dict[str, Any]:
    return {
        "result": str(result),
        "account": str(account),
        "samples": len(found.time_s),
        "sensitivity_na_um": {"start": found.sensitivity_start, "end": found.sensitivity_end},
        "fixed_factors": found.fixed,
        "before": found.account["before"],
        "after": found.account["after"],
        "warnings": found.warnings,
    }


def sentences(found: Converted, result: Path, account: Path) -> list[str]:
    start, end = found.sensitivity_start, found.sensitivity_end
    return [
        f"{len(found.time_s)} samples converted to {result.name}; what it rests on stands in {account.name}",
        f"sensitivity {_span(start)} nA/µM at the start, {_span(end)} at the end (median and 90 % interval)",
        *[_fixed(one) for one in found.fixed],
        *[f"! {warning}" for warning in found.warnings],
    ]


def _fixed(one: FixedFactor) -> str:
    average, end = one.off_on_average, one.off_at_end
    return (
        f"a fixed factor from {one.calibration} ({one.stage}, {shown_number(one.sensitivity_na_um)} nA/µM) would read"
        f" {_off(average)} on average, {_off(end)} at the end"
    )


def _off(share: Spread) -> str:
    word = "too high" if share.median > 0 else "too low"
    return f"{abs(share.median) * 100:.0f} % {word} [{share.low * 100:+.0f}, {share.high * 100:+.0f}]"


def _span(value: Spread) -> str:
    return f"{shown_number(value.median)} [{shown_number(value.low)}, {shown_number(value.high)}]"
