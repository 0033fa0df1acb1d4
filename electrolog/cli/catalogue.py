"""Every command in one list: its module, its one line of help. The terminal loads only the one that was typed."""

from __future__ import annotations

COMMANDS: dict[str, dict[str, str]] = {
    "At the bench": {
        "new": "Add probes: one, a range, or a numbered batch.",
        "coat": "Log a coating.",
        "condition": "Log cycling before use.",
        "calibrate": "Log a calibration with its points; answers with sensitivity and detection limit.",
        "trace": "Log a calibration from a flow-cell recording.",
        "scans": "Log a calibration from a sheet of scans.",
        "expose": "Log time in tissue or flow.",
        "clean": "Log a cleaning.",
        "recut": "Log that the carbon was trimmed.",
        "inspect": "Log what a look or a test showed.",
        "note": "Log a remark on a probe.",
        "retire": "Log the end of a probe's use.",
        "again": "Log your last entry once more, for another probe.",
        "standard": "Log a standard solution, weighed, diluted or bought.",
        "dilutions": "Plan the dilutions of a calibration from a stock.",
    },
    "Asking back": {
        "shelf": "Every probe with its state; or, for a planned run, the usable ones best first.",
        "life": "One probe's life as a timeline.",
        "history": "A probe's sensitivity against its exposure.",
        "calibrations": "Calibrations with all their figures.",
        "concentration": "Read the concentration of an unknown off a calibration.",
        "control": "Control chart of a check probe or check standard, per rig.",
        "list": "The lab's words, analytes, waveforms, batches or standards.",
        "labels": "A sheet of stickers with codes that a hand scanner reads.",
        "report": "One page of probes, of a batch or of the lab, to read, print and keep.",
    },
    "Judging": {
        "forecast": "What probes will still see after a run.",
        "check": "Fit, recalibrate, retire or undetermined, before a run.",
        "assign": "Which probe for which of the week's planned runs.",
        "outlook": "When each probe will have to be retired, and how many to make this month.",
        "diagnose": "Why a probe got worse, with the evidence for and against each cause.",
        "compare": "Whether coatings, fibres, makers, batches, waveforms, cures or cleanings differ.",
        "fit": "How this lab's probes foul, as learned from its record.",
        "backtest": "Whether forecasts would have been right on this lab's own past.",
        "convert": "A recording's currents into concentrations with a band.",
        "limits": "What the lab demands of a probe.",
    },
    "Correcting and trusting": {
        "amend": "Correct a value; the old one is kept.",
        "strike": "Take an entry out of every answer; it is kept.",
        "journal": "What was done to the record, by whom and why.",
        "verify": "Replay the journal against the record.",
        "recompute": "Make all figures again from the raw points.",
    },
    "The record": {
        "methods": "The methods paragraph of a paper and its supplementary table.",
        "dictionary": "What every column of the record means.",
        "settings": "What is taken where nothing is typed: rig, by, zone.",
        "completion": "What makes your shell complete commands, labels and words.",
        "setup": "Make a record, or bring an older one up to date.",
        "add": "Add a word, an analyte or a waveform.",
        "runs": "Log the runs that a folder of recordings tells of: dry run first.",
        "enclose": "Put a probe's papers into a recording, or beside it.",
        "adopt": "Take in a spreadsheet as the lab kept it: dry run first.",
        "backup": "Write a checked backup while others go on.",
        "restore": "Put a backup in the record's place.",
        "rescue": "Save what can be saved of a damaged file.",
        "roles": "On a server: who may read, log or keep the record.",
        "move": "Copy the whole record to another place or engine, proven equal.",
        "template": "Make an empty spreadsheet that adopt reads.",
        "import": "Read an exchange folder.",
        "export": "Write an exchange folder.",
    },
}

# What enters or changes something and only confirms it: silent with --quiet.
WRITING = {
    *(set(COMMANDS["At the bench"]) - {"dilutions"}),
    *("amend", "strike", "recompute", "add", "adopt", "runs", "enclose", "template", "import", "export", "setup"),
}
HELP = {name: text for section in COMMANDS.values() for name, text in section.items()}


def module_of(name: str) -> str:
    """`import` and `list` can't name a module that others import by name."""
    return f"electrolog.cli.{name}_command" if name in ("import", "list") else f"electrolog.cli.{name}"
