"""The terminal's edge: finds the command, and turns every refusal into one line and an exit status."""

from __future__ import annotations

import contextlib
import difflib
import gc
import importlib
import json
import os
import sys
from pathlib import Path
from typing import Annotated, Any

import typer
from typer.core import TyperGroup
from typer.exceptions import TyperException

from electrolog.cli.asking import AskingCommand
from electrolog.cli.catalogue import COMMANDS, HELP, WRITING, module_of
from electrolog.cli.preferences import ENTRIES, in_force
from electrolog.cli.session import Session
from electrolog.errors import ElectrologError, FaultyRows, InputError
from electrolog.show.text import one_line, prepare_streams, safe


class ReaderGone(Exception):
    """Nobody reads what is printed any more, as in `| head`."""


class LazyCommands(TyperGroup):
    """Loads a command's module when it is typed; the overview needs none of them."""

    def list_commands(self, ctx: typer.Context) -> list[str]:  # type: ignore[override]
        return list(HELP)

    def get_command(self, ctx: typer.Context, cmd_name: str) -> Any:  # type: ignore[override]
        if cmd_name not in HELP:
            near = difflib.get_close_matches(cmd_name, list(HELP), n=1)
            said = f"the nearest one is '{near[0]}'" if near else f"known: {', '.join(HELP)}"
            raise InputError(
                f"no command is called '{one_line(cmd_name)[:80]}'; {said}", "electrolog --help lists them"
            )
        module = importlib.import_module(module_of(cmd_name))
        single = typer.Typer(add_completion=False, rich_markup_mode=None, pretty_exceptions_enable=False)
        explained = _unwrapped(module.command.__doc__)
        single.command(cmd_name, cls=AskingCommand, help=explained)(module.command)
        return typer.main.get_command(single)

    def invoke(self, ctx: Any) -> Any:
        try:
            return super().invoke(ctx)
        except BrokenPipeError:  # the library would end the program with status 1
            raise ReaderGone from None

    def format_commands(self, ctx: typer.Context, formatter: Any) -> None:  # type: ignore[override]
        for section, commands in COMMANDS.items():
            with formatter.section(section):
                formatter.write_dl(list(commands.items()))


def _unwrapped(text: str | None) -> str:
    """A docstring's example keeps its line breaks."""
    import inspect

    paragraphs = inspect.cleandoc(text or "").split("\n\n")
    return "\n\n".join(f"\b\n{part}" if "electrolog " in part else part for part in paragraphs)


app = typer.Typer(
    cls=LazyCommands,
    add_completion=False,
    rich_markup_mode=None,
    pretty_exceptions_enable=False,
    context_settings={"help_option_names": ["-h", "--help"]},
)


@app.callback()
def electrolog(
    ctx: typer.Context,
    db: Annotated[
        str | None,
        typer.Option("--db", envvar="ELECTROLOG_DB", metavar="WHERE", help="The record: a file, or an SQLAlchemy URL."),
    ] = None,
    zone: Annotated[
        str | None,
        typer.Option("--zone", metavar="NAME", help="Zone of times without an offset (default: the machine's)."),
    ] = None,
    quiet: Annotated[bool, typer.Option("--quiet", help="Say nothing of an entry that went well.")] = False,
) -> None:
    """The life of every carbon-fibre microelectrode: what it was, what it sees, how long it will hold.

    It advises people who decide: approved protocol, licensed practice and local rules come first. Never for
    clinical decisions.
    """
    told = {} if ctx.invoked_subcommand == "settings" else in_force(db)
    ctx.obj = Session(told.get("db") if db is None else db, zone or told.get("zone"))
    ctx.default_map = dict.fromkeys(ENTRIES, told)
    if quiet and ctx.invoked_subcommand in WRITING:
        silenced = ctx.with_resource(Path(os.devnull).open("w", encoding="utf-8"))  # noqa: SIM115 -- it closes it
        ctx.with_resource(contextlib.redirect_stdout(silenced))


def run() -> None:
    gc.disable()  # loading libraries leaves no garbage; looking for it takes a tenth of a command. See Session.lab.
    prepare_streams()
    sys.exit(main(sys.argv[1:]))


def main(arguments: list[str]) -> int:
    """Runs one command line and returns its exit status."""
    try:
        _refuse_undecodable(arguments)
        answer = app(arguments or ["--help"], prog_name="electrolog", standalone_mode=False)
        sys.stdout.flush()
        return answer if isinstance(answer, int) else 0
    except (typer.Abort, KeyboardInterrupt):
        print("electrolog: stopped; nothing was written", file=sys.stderr)  # noqa: T201
        return 130
    except (BrokenPipeError, ReaderGone):
        # Without this the interpreter complains once more at its end.
        os.dup2(os.open(os.devnull, os.O_WRONLY), sys.stdout.fileno())
        return 0
    except Exception as error:
        refusal = _as_refusal(error)
        _report(refusal, "--json" in arguments)
        return refusal.exit_code


def _refuse_undecodable(arguments: list[str]) -> None:
    if any("\0" in argument for argument in arguments):
        raise InputError("the command line holds a NUL; accepted: text in UTF-8")
    try:
        "".join(arguments).encode()
    except UnicodeEncodeError:
        raise InputError("the command line holds bytes that are not UTF-8; accepted: text in UTF-8") from None


def _as_refusal(error: Exception) -> ElectrologError:
    if isinstance(error, ElectrologError):
        return error
    if isinstance(error, TyperException):
        hint = "electrolog COMMAND --help shows what it takes"
        return InputError(one_line(error.format_message()).rstrip("."), hint)
    if isinstance(error, OSError):
        return ElectrologError(f"{error.filename or 'system'}: {error.strerror or error}")
    if os.environ.get("ELECTROLOG_DEBUG"):
        raise error
    said = f"an error in electrolog itself ({type(error).__name__}: {one_line(error)[:200]})"
    return ElectrologError(said, "please report it; ELECTROLOG_DEBUG=1 shows where")


def _report(error: ElectrologError, as_json: bool) -> None:
    if as_json:
        body: dict[str, Any] = {"kind": error.kind, "message": error.message, "hint": error.hint}
        if isinstance(error, FaultyRows):
            body["faults"] = list(error.faults)
        sys.stderr.write(json.dumps({"error": body}) + "\n")
        return
    sys.stderr.write(f"electrolog: {safe(error.message)}{' -- ' + safe(error.hint) if error.hint else ''}\n")
    if isinstance(error, FaultyRows):
        sys.stderr.writelines(f"  {one_line(fault)}\n" for fault in error.faults)


if __name__ == "__main__":
    run()
