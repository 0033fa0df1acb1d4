"""What was found in a recording that isn't logged yet."""

from __future__ import annotations

from electrolog.answers.signals import Recorded
from electrolog.measure.calibrate import CalibrationFigures
from electrolog.measure.recording import once_negative
from electrolog.show.calibrations import figure_lines
from electrolog.show.machine import print_json
from electrolog.show.tables import print_lines, print_table
from electrolog.units import shown_concentration, shown_number


def answer(recorded: Recorded, figures: CalibrationFigures, json: bool) -> None:
    account = recorded.account
    if json:
        print_json({**account, **recorded.columns, "doubts": recorded.doubts, "figures": figures.to_dict()})
        return
    print_lines(f"{account['file']}: {len(account['injections'])} injections; nothing was logged")
    print_table(*injections(recorded))
    print_lines(*facts(recorded), *figure_lines(figures))
    said = once_negative((*recorded.doubts, *recorded.warnings, *figures.warnings))
    print_lines(*[f"! {text}" for text in said])


def injections(recorded: Recorded) -> tuple[list[str], list[list[object]], list[str]]:
    """Columns, rows, and which columns hold numbers."""
    traced = recorded.account["from"] == "trace"
    own = ["noise (nA)", "10-90 % (s)", "90-10 % (s)"] if traced else ["oxidation (V)", "reduction (V)", "apart (V)"]
    rows: list[list[object]] = []
    for place, one in enumerate(recorded.account["injections"], 1):
        if traced:
            facts_of_it = [one["noise_na"], one["rise_s"], one["fall_s"]]
        else:
            peaks = (one["oxidation"], one["reduction"])
            facts_of_it = [*[peak and peak["potential_v"] for peak in peaks], one["separation_v"]]
        mark = " (left out)" if place in recorded.account["left_out"] else ""
        rows.append(
            [
                f"{place}{mark}",
                f"{one['start_s']:.0f} to {one['end_s']:.0f}",
                shown_concentration(one["concentration_um"]),
                shown_number(one["level_na"], 4),
                *[shown_number(value) for value in facts_of_it],
            ]
        )
    columns = ["injection", "seconds", "concentration", "current (nA)", *own]
    return columns, rows, columns[1:]


def facts(recorded: Recorded) -> list[str]:
    account, columns = recorded.account, recorded.columns
    said = [f"noise {shown_number(account['noise_na'])} nA"]
    if "taken_at_v" in account:
        said.append(f"points taken at {shown_number(account['taken_at_v'])} V")
        said.append(
            f"background {shown_number(columns['background_na'], 4)} nA at {shown_number(account['background_at_v'])} V"
        )
    return ["  " + ", ".join(said)]
