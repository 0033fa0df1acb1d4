"""A command typed without arguments asks for what it takes, step by step; only where a person sits at a terminal."""

from __future__ import annotations

import json
import os
import shlex
import sys
from collections.abc import Iterator
from pathlib import Path
from typing import Any

import typer
from typer.core import TyperCommand

from electrolog.show.text import safe

# Worth a question although they may be left out; the rest is for those who know that it is there.
ALSO = ("at", "start", "waveform", "standard", "medium", "rig", "by", "pairs", "subject", "note")
NEVER_KEPT = ("at", "start", "note", "pairs", "labels", "label", "probe", "points")  # of this probe, this moment


class AskingCommand(TyperCommand):
    def parse_args(self, ctx: Any, args: list[str]) -> list[str]:
        if not args and any(param.required for param in self.params) and sys.stdin.isatty() and sys.stderr.isatty():
            args = list(self._asked(ctx))
        return super().parse_args(ctx, args)

    def _asked(self, ctx: Any) -> Iterator[str]:
        """The words of a command line, as if they had been typed."""
        kept = _kept()
        last = {**kept.get(str(self.name), {}), **(ctx.default_map or {})}
        typer.echo(f"{self.name}: Enter takes what stands in brackets, or leaves it out", err=True)
        answers: dict[str, str] = {}
        for param in self.params:
            if param.required or param.name in ALSO:
                answers[str(param.name)] = _ask(param, last.get(str(param.name)))
        ctx.default_map = None  # what a person has just left out isn't put back
        _keep({**kept, str(self.name): {key: said for key, said in answers.items() if key not in NEVER_KEPT}})
        for param in self.params:
            said = answers.get(str(param.name), "")
            yield from _words(param, said) if said else ()


def _ask(param: Any, last: Any) -> str:
    about = getattr(param, "help", None) or param.metavar or ""
    shown = "" if param.default is None or callable(param.default) else str(param.default)
    default = str(last or shown)
    while True:
        said = str(typer.prompt(f"{param.name} ({safe(about).rstrip('.')})", default=default, err=True)).strip()
        if said or not param.required:
            return said
        typer.echo("  this one is needed", err=True)


def _words(param: Any, said: str) -> list[str]:
    if param.param_type_name == "argument":
        return shlex.split(said) if param.nargs == -1 else [said]
    return [param.opts[0], said]


def _file() -> Path:
    named = os.environ.get("ELECTROLOG_ANSWERS")
    if named:
        return Path(named)
    import platformdirs

    return platformdirs.user_state_path("electrolog", appauthor=False) / "answers.json"


def _kept() -> dict[str, dict[str, str]]:
    """The last answers by command; a file that can't be read is only a default less."""
    try:
        found = json.loads(_file().read_text(encoding="utf-8"))
        return {str(name): dict(answers) for name, answers in found.items()}
    except (OSError, ValueError, TypeError, AttributeError):
        return {}


def _keep(answers: dict[str, dict[str, str]]) -> None:
    try:
        _file().parent.mkdir(parents=True, exist_ok=True)
        _file().write_text(json.dumps(answers, ensure_ascii=False, indent=1), encoding="utf-8")
    except OSError:
        typer.echo("  (these answers can't be kept for the next time)", err=True)
