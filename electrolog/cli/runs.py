from __future__ import annotations

import sys
from pathlib import Path
from typing import TYPE_CHECKING, Annotated, Any

import typer

from electrolog.cli.options import Json, Waveform, Yes
from electrolog.cli.session import lab_of
from electrolog.show.text import safe

if TYPE_CHECKING:
    from electrolog.answers.recordings.runs import Runs
    from electrolog.lab import Lab


def command(
    ctx: typer.Context,
    folder: Annotated[Path, typer.Argument(metavar="FOLDER", help="Where the recordings lie, in folders too.")],
    setting: Annotated[
        str | None, typer.Option("--setting", "-s", help="Where the probes were: in-vivo, slice, flow-cell, …")
    ] = None,
    probe: Annotated[
        list[str] | None,
        typer.Option("--probe", "-p", metavar="LABEL", help="Of all that name none; or FILE=LABEL, repeatable."),
    ] = None,
    waveform: Waveform = None,
    subject: Annotated[str | None, typer.Option("--subject", help="Of all recordings that name none.")] = None,
    commit: Annotated[bool, typer.Option("--commit", help="Write it; without, it is a dry run.")] = False,
    make_list: Annotated[
        bool, typer.Option("--list", help="Only write FOLDER/recordings.csv, to be filled in.")
    ] = False,
    yes: Yes = False,
    json: Json = False,
) -> None:
    """Log the runs that a folder of recordings tells of: first a dry run, then --commit.

    electrolog runs recordings --setting in-vivo --commit

    NWB files say when they began, how long they are and whose they are; of .csv, .npy and .h5 files a list says it,
    recordings.csv in the same folder. Which probe it was is told by the list, by the papers that `enclose` has put
    into the file, or by the name of the file or its folder.
    """
    from electrolog.show import runs as show
    from electrolog.show.progress import working

    lab = lab_of(ctx)
    said: dict[str, Any] = {"setting": setting, "waveform": waveform, "subject": subject, **_probes(probe or ())}
    with working("reading recordings") as tell:
        if make_list:
            show.listed(lab.list_recordings(folder, setting=setting, progress=tell), json)
            return
        found = lab.read_runs(folder, **said, progress=tell)
    found = _answered(lab, folder, said, found)
    if commit:
        with working("logging runs") as tell:
            found = lab.read_runs(folder, **said, commit=True, confirmed=yes, progress=tell)
    show.answer(found, json)


def _probes(typed: list[str] | tuple[str, ...]) -> dict[str, Any]:
    pairs = [text.rpartition("=") for text in typed if "=" in text]
    alone = [text for text in typed if "=" not in text]
    return {"probe": alone[-1] if alone else None, "probes": {file.strip(): label.strip() for file, _, label in pairs}}


def _answered(lab: Lab, folder: Path, said: dict[str, Any], found: Runs) -> Runs:
    """Asks a person what no file tells."""
    if not (found.questions and sys.stdin.isatty() and sys.stderr.isatty()):
        return found
    for question in found.questions:
        typer.echo(safe(question), err=True)
    said["setting"] = typer.prompt("setting", err=True)
    return lab.read_runs(folder, **said)
