from __future__ import annotations

import sys
from pathlib import Path
from typing import TYPE_CHECKING, Annotated

import typer

from electrolog.cli.options import Json
from electrolog.cli.preferences import in_force
from electrolog.cli.session import lab_of
from electrolog.errors import InputError
from electrolog.show.text import safe

if TYPE_CHECKING:
    from electrolog.record.books.adoption import Adoption
    from electrolog.record.books.drafts import Question


def command(
    ctx: typer.Context,
    book: Annotated[Path, typer.Argument(metavar="BOOK", help="An .xlsx, .xls, .ods or .csv file.")],
    mapping: Annotated[
        Path | None, typer.Option("--mapping", metavar="FILE", help="How it is read (default: BOOK.adopt.toml).")
    ] = None,
    answer: Annotated[
        list[str] | None, typer.Option("--answer", metavar="KEY=VALUE", help="What the book can't tell; repeatable.")
    ] = None,
    commit: Annotated[bool, typer.Option("--commit", help="Write it; without, it is a dry run.")] = False,
    json: Json = False,
) -> None:
    """Take in a spreadsheet as the lab kept it: first a dry run, cell by cell, then --commit.

    electrolog adopt factors.csv --answer waveform=triangle --answer analyte=DA --commit
    """
    from electrolog.show.progress import working

    lab = lab_of(ctx, create=True)
    answers = dict(map(_split, answer or ()))
    with working("reading the book"):
        found = lab.adopt(book, mapping_file=mapping, answers=answers)
    usual = in_force(ctx.obj.db)
    while (asked := _open_questions(found, answers)) and sys.stdin.isatty() and sys.stderr.isatty():
        answers |= {one.key: _answer(one, usual.get(one.key)) for one in asked}
        with working("reading the book again"):
            found = lab.adopt(book, mapping_file=mapping, answers=answers)
    if commit:
        with working("taking it in"):
            found = lab.adopt(book, mapping_file=mapping, answers=answers, commit=True)
    from electrolog.show import adoption

    adoption.answer(found, json)


def _open_questions(found: Adoption, answers: dict[str, str]) -> list[Question]:
    return [one for one in found.questions if one.key not in answers]


def _answer(asked: Question, usual: str | None) -> str:
    """`usual`: what the settings say, in brackets: Enter takes it. Asked again for what wouldn't be accepted."""
    typer.echo(f"{safe(asked.text)}  ({safe(asked.why)})", err=True)
    typer.echo(f"  accepted: {safe(', '.join(asked.accepted))}", err=True)
    spelled = {one.casefold(): one for one in asked.accepted}
    while True:
        said: str = typer.prompt(asked.key, default=usual, err=True)
        if asked.key == "analyte" or not spelled:  # which goes by an abbreviation too
            return said
        if said.strip().casefold() in spelled:
            return spelled[said.strip().casefold()]
        typer.echo("  that is none of these", err=True)


def _split(typed: str) -> tuple[str, str]:
    key, sign, value = typed.partition("=")
    if not (sign and key.strip() and value.strip()):
        raise InputError(f"--answer: '{typed}' is no answer; accepted: such as waveform=triangle")
    return key.strip(), value.strip()
