"""What may follow the words typed so far; called by the shell at each tab, so it loads next to nothing.

python -m electrolog.cli.completing WORD...   the last word is the one being typed
"""

from __future__ import annotations

import contextlib
import os
import sys
from collections.abc import Iterator, Sequence
from typing import Any

from electrolog.cli.catalogue import HELP, module_of
from electrolog.cli.preferences import in_force, usual_place
from electrolog.record.word_kinds import WORD_KINDS

# What an option's value names: a sheet, or a word list.
VALUES = {
    "--analyte": "analytes",
    "--waveform": "waveforms",
    "--batch": "batches",
    "--standard": "standards",
    "--medium": "medium",
    "--setting": "setting",
    "--material": "coating material",
    "--fibre": "fibre",
    "--insulation": "insulation",
    "--seal": "seal",
    "--reason": "retirement reason",
    "-a": "analytes",
    "-w": "waveforms",
    "-s": "setting",
}
BY_COMMAND = {
    ("coat", "--method"): "coating method",
    ("clean", "--method"): "cleaning method",
    ("coat", "-m"): "coating material",
    ("clean", "-m"): "cleaning method",
    ("retire", "-r"): "retirement reason",
}
AFTER = {  # what a command's arguments name, in their order; the last one may repeat
    "calibrate": ("electrodes", "stage", "analytes"),
    "trace": ("electrodes", "stage", "analytes"),
    "scans": ("electrodes", "stage", "analytes"),
    "standard": ("", "analytes"),
    "concentration": ("calibrations",),
    **dict.fromkeys(("amend", "strike"), ("kind", "of that kind")),
    "list": ("list",),
    "completion": ("shell",),
    "limits": ("action", ""),
    "add": ("addable", ""),
    "dilutions": ("standards", ""),
    # what isn't the record's to name: files and folders, which the shell offers, or text
    **dict.fromkeys(("adopt", "import", "export", "template", "runs", "enclose", "convert", "assign"), ("",)),
    **dict.fromkeys(("backup", "restore", "rescue", "move", "roles", "settings", "new"), ("",)),
    **dict.fromkeys(("setup", "journal", "verify", "recompute", "dictionary", "shelf"), ("",)),
    **dict.fromkeys(("compare", "fit", "backtest"), ("",)),
}
OF_A_KIND = {  # what `amend` and `strike` call by a label
    "calibration": "calibrations",
    "point": "calibrations",
    "probe": "electrodes",
    "batch": "batches",
    "standard": "standards",
    "analyte": "analytes",
    "waveform": "waveforms",
}
FIXED = {
    "stage": ("pre", "interim", "post"),
    "kind": (
        *OF_A_KIND,
        *("exposure", "cleaning", "coating", "conditioning", "inspection", "re-cut", "retirement", "word"),
    ),
    "list": ("words", "analytes", "waveforms", "batches", "standards"),
    "action": ("list", "set", "unset", "adopt"),
    "addable": ("analyte", "waveform", *WORD_KINDS),
    "shell": ("bash", "zsh", "fish", "powershell"),
}
GLOBAL = ("--db", "--zone", "--quiet")


def completions(words: Sequence[str]) -> list[str]:
    """Sorted as they are offered; none means that the shell offers files."""
    *before, typed = words or [""]
    where, command, rest = _taken_apart(before)
    if command is None:
        choices: Sequence[str] = (*HELP, *GLOBAL)
        return [name for name in choices if name.startswith(typed)]
    if typed.startswith("-"):
        return [option for option in _options(command) if option.startswith(typed)]
    last = rest[-1] if rest else ""
    what = BY_COMMAND.get((command, last)) or VALUES.get(last)
    if what is None and last.startswith("-") and _takes_value(command, last):
        return []
    what = what or _argument(command, rest)
    if what == "of that kind":
        what = OF_A_KIND.get(next(_arguments(command, rest)), "")
    if what in FIXED:
        return [word for word in FIXED[what] if word.startswith(typed)]
    from electrolog.record.completions import names

    return [f"{_ahead(typed)}{name}" for name in names(where, what, typed.removeprefix(_ahead(typed)))] if what else []


def _ahead(typed: str) -> str:
    """`B1-01,B1-` and `B1-01..B1-`: the part before the label being typed."""
    start = max(typed.rfind(",") + 1, typed.rfind("..") + 2 if ".." in typed else 0)
    return typed[:start]


def _taken_apart(before: Sequence[str]) -> tuple[str, str | None, list[str]]:
    """Where the record is, the command, and the words behind it."""
    where = os.environ.get("ELECTROLOG_DB", "")
    words = iter(before)
    for word in words:
        if word in ("--db", "--zone"):
            value = next(words, "")
            where = value if word == "--db" else where
        elif not word.startswith("-"):
            return where or in_force(None).get("db") or usual_place(), word if word in HELP else "", list(words)
    return where, None, []


def _argument(command: str, rest: Sequence[str]) -> str:
    if command not in HELP:
        return ""
    kinds = AFTER.get(command, ("electrodes",))
    given = len(list(_arguments(command, rest)))
    return kinds[min(given, len(kinds) - 1)] if given < len(kinds) or len(kinds) == 1 else ""


def _arguments(command: str, rest: Sequence[str]) -> Iterator[str]:
    words = iter(rest)
    for word in words:
        if not word.startswith("-"):
            yield word
        elif _takes_value(command, word):
            next(words, None)


def _takes_value(command: str, option: str) -> bool:
    return option in VALUES or (command, option) in BY_COMMAND or option in _options(command, with_value=True)


def _options(command: str, with_value: bool = False) -> list[str]:
    """Asked of the command itself, which only this needs to load."""
    if command not in HELP:
        return []
    import importlib

    import typer

    single = typer.Typer(add_completion=False)
    single.command()(importlib.import_module(module_of(command)).command)
    params: list[Any] = typer.main.get_command(single).params
    chosen = (param for param in params if not (with_value and getattr(param, "is_flag", False)))
    return [name for param in chosen for name in param.opts if name.startswith("-")]


def main() -> None:
    # A tab must never print a traceback into what somebody is typing.
    with contextlib.suppress(Exception):
        words = ["" if word == '""' else word for word in sys.argv[1:]]  # some PowerShells pass an empty word so
        sys.stdout.write("\n".join(completions(words)))


if __name__ == "__main__":
    main()
