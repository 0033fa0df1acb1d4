from __future__ import annotations

from typing import Annotated

import typer

from electrolog.cli.options import Json
from electrolog.cli.preferences import KEYS, in_force, lab_file, own_file, read, write
from electrolog.clock import zone_named
from electrolog.errors import InputError, unknown


def command(
    ctx: typer.Context,
    changes: Annotated[
        list[str] | None, typer.Argument(metavar="[KEY=VALUE...]", help="Written to your own file; KEY= takes one out.")
    ] = None,
    json: Json = False,
) -> None:
    """Show or write what is taken where nothing is typed: rig, by, zone and the like.

    electrolog settings rig=north by=wren
    """
    if changes:
        write(own_file(), dict(map(_split, changes)))
    db = ctx.obj.db
    files = [path for path in (lab_file(db), own_file()) if path is not None]
    rows = [(key, value, str(path)) for path in files for key, value in read(path, path == own_file()).items()]
    if json:
        from electrolog.show.machine import print_json

        print_json({"files": [str(path) for path in files], "in_force": in_force(db)})
        return
    from electrolog.show.tables import print_lines, print_table

    print_table(("setting", "value", "file"), rows)
    print_lines(f"yours: {own_file()}", f"the lab's, beside its record: {lab_file(db) or 'none, since it is no file'}")


def _split(typed: str) -> tuple[str, str]:
    key, sign, value = typed.partition("=")
    if not sign:
        raise InputError(f"'{typed}' is no setting; accepted: such as rig=north, or rig= to take it out")
    if key not in KEYS:
        raise unknown("setting", key, KEYS)
    if key == "zone":
        zone_named(value)  # one that isn't would stop every command from now on
    return key, value
