"""A concentration read off a calibration."""

from __future__ import annotations

from electrolog.answers.reading_off import ReadOff
from electrolog.show.machine import print_json
from electrolog.show.tables import print_lines
from electrolog.units import shown_concentration, shown_number, shown_percent


def answer(found: ReadOff, json: bool) -> None:
    if json:
        print_json(found)
        return
    several = f" (mean of {found.replicates})" if found.replicates > 1 else ""
    head = f"{shown_number(found.current_na, 4)} nA{several} by {found.calibration} of {found.electrode}: "
    print_lines(head + _estimate(found), *[f"  {line}" for line in _intervals(found)])
    print_lines(*[f"  ! {text}" for text in found.warnings])


def _estimate(found: ReadOff) -> str:
    own = found.prediction
    if own.concentration_um is None:
        return f"no concentration: {own.why_not}"
    error = f" ± {shown_concentration(own.se_um, 2)}" if own.se_um is not None else f"; {own.why_not}"
    return f"{shown_concentration(own.concentration_um)} {found.analyte}{error}"


def _intervals(found: ReadOff) -> list[str]:
    own, lines = found.prediction, []
    for name, pair in (("Fieller", own.fieller_um), ("delta", own.delta_um)):
        if pair is not None:
            low, high = (shown_concentration(value) for value in pair)
            lines.append(f"{found.confidence:.0%} interval {low} to {high} ({name})")
    if found.standard_relative_uncertainty and own.concentration_um is not None:
        share = shown_percent(found.standard_relative_uncertainty)
        lines.append(f"beside it the standard's own uncertainty, {share}, shared by all that rests on it")
    return lines
